"""Which fragments are planned, in which charges and spins, under which keys."""

import pytest
from campaigns import changed, load
from scission.geometry import build_path
from scission.plan import make_plan
from scission.plan.fragments import charge_splits, couples, fragment_splits, fragment_work, unpaired_options

# Ground-state multiplicities of atoms and ions: NIST Atomic Spectra Database (from memory).
HUND = {("H", 0): 2, ("H", -1): 1, ("Li", 0): 2, ("B", 0): 2, ("C", 0): 3, ("N", 0): 4, ("O", 0): 3}
HUND |= {("F", 0): 2, ("F", -1): 1, ("F", 1): 3, ("N", 1): 3, ("C", -1): 4, ("Br", 0): 2, ("Cr", 0): 7}


@pytest.mark.parametrize(("atom", "multiplicity"), HUND.items())
def test_ground_states_of_atoms_are_among_the_spins_tried(atom, multiplicity):
    """Hund's rule is never left out."""
    symbol, charge = atom

    assert multiplicity - 1 in unpaired_options([symbol], charge)


def test_charges_are_shared_in_every_way():
    """One electron moves either way in a neutral molecule; a charge stays on one side or is shared."""
    assert charge_splits(0) == [(0, 0), (1, -1), (-1, 1)]
    assert set(charge_splits(1)) == {(0, 1), (1, 0)}
    assert set(charge_splits(-2)) == {(0, -2), (-1, -1), (-2, 0)}


def test_spins_couple_by_the_triangle_rule():
    """Two quartets make a singlet, a quartet and a doublet do not."""
    assert couples(3, 3, 0)
    assert not couples(3, 1, 0)
    assert couples(2, 1, 1)


def splits(folder, scan, level, *edits):
    campaign = load(changed(*edits), folder)
    block = campaign.scans[scan]
    molecule = campaign.molecules[block.molecule]
    return fragment_splits(molecule, campaign.levels[level], build_path(molecule, block))


def test_restricted_levels_get_restricted_fragments(tmp_path):
    """RHF and coupled cluster on it: ROHF for the open shells, RHF for closed ions; UHF stays UHF."""
    neutral = [s for s in splits(tmp_path, "one-oh", "cc") if not s.ionic]
    ionic = [s for s in splits(tmp_path, "one-oh", "cc") if s.ionic]

    assert {state.work["spec"]["reference"] for s in neutral for state in s.states} == {"ROHF"}
    assert {state.work["spec"]["reference"] for s in ionic for state in s.states} == {"RHF"}
    unrestricted = splits(tmp_path, "radical", "ucc")
    assert {state.work["spec"]["reference"] for s in unrestricted for state in s.states} == {"UHF"}


def test_scans_share_their_fragments(tmp_path):
    """The hydrogen of a second O-H scan has the same keys; each is computed in one job only."""
    other = {"molecule": "water", "levels": ["cc"], "stretch": {"bond": ["O1", "H3"], "lengths": [0.9, 5.0]}}
    campaign = load(changed(("scans/other", other)), tmp_path)
    jobs = [job for job in make_plan(campaign).jobs if job.stage == "fragments"]
    keys = [item["key"] for job in jobs for item in job.payload["points"]]

    assert len(keys) == len(set(keys))
    first, second = (
        {s.key for split in splits(tmp_path, scan, "cc", ("scans/other", other)) for s in split.states}
        for scan in ("one-oh", "other")
    )
    assert len(first & second) >= 3


def test_points_do_not_decide_the_keys_of_fragments(tmp_path):
    """More lengths, or other lengths, give the same fragments, also of an active space."""
    for level in ("cc", "cas"):
        before = {s.key for split in splits(tmp_path, "one-oh", level) for s in split.states}
        more = ("scans/one-oh/stretch/lengths", [0.8, 0.96, 3.0, 9.0])
        after = {s.key for split in splits(tmp_path, "one-oh", level, more) for s in split.states}

        assert before == after


def test_active_spaces_wait_for_their_references(tmp_path):
    """Fragments of a CASSCF need the job that establishes the scan's references; others need none."""
    jobs = [job for job in make_plan(load(changed(), tmp_path)).jobs if job.stage == "fragments"]
    needing = {item["spec"]["reference"] for job in jobs if job.needs for item in job.payload["points"]}

    assert needing == {"CASSCF"}


def test_high_spins_get_fragments_of_high_spin(tmp_path):
    """Oxygen and hydrogen as a sextet need a quintet and a doublet: more than is usually tried."""
    found = splits(tmp_path, "radical", "ucc", ("molecules/hydroxyl/multiplicity", 6))

    assert any({s.multiplicity for s in split.states} == {5, 2} for split in found)


def test_small_groups_may_be_quartets():
    """CH: doublet and quartet lie close (0.74 eV; Huber and Herzberg, from memory); methyl has no such state."""
    assert unpaired_options(["C", "H"], 0) == [1, 3]
    assert unpaired_options(["C", "H", "H", "H"], 0) == [1]


def test_two_equal_atoms_are_one_fragment(tmp_path):
    """The atoms of a homonuclear molecule have equal shares of its active space: each state is computed once."""
    stretch = {"bond": ["H1", "H2"], "lengths": [0.7, 3.0]}
    scan = {"molecule": "hydrogen", "levels": ["cas"], "stretch": stretch}
    campaign = load(changed(("scans", {"hh": scan})), tmp_path)
    work = fragment_work(campaign, make_plan(campaign).points)
    states = [(w["molecule"]["charge"], w["molecule"]["multiplicity"]) for w in work]

    assert sorted(states) == sorted(set(states))
