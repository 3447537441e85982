"""The forecast: scaling laws, what records teach, adding a plan up, refusing what is too large."""

import json
import math

import pytest
from campaigns import changed, load
from scission.cli import main
from scission.cli.check import learnt
from scission.forecast import Calibration, calibrate, estimate
from scission.forecast.calibration import CACHE, UNKNOWN, Group, expectation
from scission.forecast.cost import correlate_seconds, n_functions, reference_seconds
from scission.forecast.estimate import makespan
from scission.plan import Job, make_plan
from scission.records import Record, Store

WATER = {"symbols": ["O", "H", "H"], "charge": 0, "multiplicity": 1}
HYDROGEN = {"symbols": ["H", "H"], "charge": 0, "multiplicity": 1}
H2 = """
campaign: h2-check
molecules:
  h2: {charge: 0, multiplicity: 1, atoms: "H 0 0 0\\nH 0 0 0.74"}
levels:
  hf: {reference: RHF, correlation: none, basis: sto-3g}
  cc: {reference: RHF, correlation: CCSD, basis: cc-pVDZ}
scans:
  bond:
    molecule: h2
    levels: [hf, cc]
    stretch: {bond: [H1, H2], lengths: {from: 0.5, to: 3.0, points: 6, spacing: even}}
"""


def work(molecule, correlation="CCSD(T)", basis="cc-pvdz"):
    """The inputs of a correlated point, as its record states them."""
    spec = {"reference": "RHF", "basis": dict.fromkeys(molecule["symbols"], basis)}
    return {"molecule": molecule, "spec": spec, "correlation": correlation, "frozen_core": True}


def job(name, needs=()):
    """A job of which only the order matters."""
    return Job(name, "correlate", tuple(needs), 1, 1, 1, {})


@pytest.fixture
def results(tmp_path):
    """Results of one campaign whose water points took twice as long as the law says."""
    store, item = Store(tmp_path / "first"), work(WATER)
    (tmp_path / "first" / "plan").mkdir(parents=True)
    (tmp_path / "first" / "plan" / "plan.json").write_text("{}")
    (tmp_path / "first" / "jobs").mkdir()
    for i in range(20):
        scalars = {"energy": -76.0, "wall_s": 2.0 * expectation(item)[1]}
        store.write(Record(f"aa{i:02d}", "point", "converged", scalars=scalars, inputs=item))
    return tmp_path


def test_water_has_24_functions_in_cc_pvdz():
    """14 on oxygen, 5 on each hydrogen: Dunning, J. Chem. Phys. 90, 1007 (1989), spherical."""
    assert n_functions(WATER, work(WATER)["spec"]) == 24


def test_triples_scale_with_the_fifth_power_of_the_basis_at_fixed_electrons():
    """Four times the virtual orbitals, up to the occupied ones: o^3 v^4 leaves at least a factor 100."""
    small, large = (correlate_seconds(work(WATER, basis=b)) for b in ("cc-pvdz", "cc-pvqz"))

    assert large / small > 100


def test_records_that_took_twice_as_long_double_the_forecast(results):
    """Exactly, at the size that was seen; with less doubt than before."""
    known = calibrate(results)

    assert known.factor("CCSD(T) on RHF", 24) == pytest.approx(2.0)
    assert known.uncertainty("CCSD(T) on RHF", 24) < 0.6 * UNKNOWN
    assert known.factor("NEVPT2 on CASSCF", 24) == 1.0


def test_doubt_grows_away_from_what_was_seen(results):
    """Twenty times as many functions are known less well than twice as many."""
    known = calibrate(results)
    doubts = [known.uncertainty("CCSD(T) on RHF", n) for n in (24, 48, 480)]

    assert doubts == sorted(doubts)
    assert doubts[0] < doubts[2]


def test_the_nearest_size_counts_most():
    """Between a group at ratio 1 and one at ratio 4 the factor follows the nearer one."""
    known = Calibration({"CCSD on RHF": [Group(10, 1.0, 30), Group(100, 4.0, 30)]})

    assert known.factor("CCSD on RHF", 12) < 1.3
    assert known.factor("CCSD on RHF", 90) > 3.0
    assert known.factor("CCSD on RHF", 32) == pytest.approx(2.0, rel=0.02)  # geometric middle


def test_what_was_learnt_is_kept_and_damage_to_it_does_no_harm(results):
    """A second reading comes from the file; one that is cut short or absurd is made anew."""
    first = calibrate(results)
    path = results / CACHE
    kept = path.read_text()

    assert calibrate(results) == first
    for text in ("", kept[:-20], kept.replace("2.0", "-2.0"), "[]", '{"calibration": 1, "campaigns": []}'):
        path.write_text(text)
        assert calibrate(results) == first
    assert json.loads(path.read_text())["campaigns"]["first"]["groups"]


def test_damaged_records_teach_nothing_and_stay_where_they_are(results):
    """A forecast only reads: setting damaged files aside is for those who compute."""
    path = Store(results / "first").path("point", "aa00")
    path.write_bytes(path.read_bytes()[:100])

    assert calibrate(results).n_records == 19
    assert path.is_file()


@pytest.mark.parametrize(
    "nonsense",
    [
        {"molecule": []},
        {"spec": {"reference": "RHF", "basis": {"O": 7, "H": 7}}},
        {"spec": {"reference": "RHF", "basis": {"O": "no-such-basis", "H": "no-such-basis"}}},
        {"spec": {"reference": "XYZ", "basis": {}}},
        {"correlation": {"a": 1}},
    ],
)
def test_records_of_nonsense_teach_nothing(results, nonsense):
    """Whatever the inputs of a record say, the others are read."""
    item = work(WATER) | nonsense
    scalars = {"energy": -76.0, "wall_s": 5.0}
    Store(results / "first").write(Record("bb00", "point", "converged", scalars=scalars, inputs=item))

    assert calibrate(results).n_records == 20


def test_results_that_cannot_be_written_teach_all_the_same(results, monkeypatch, capsys):
    """A word about it, and the forecast of the records."""

    def refuse(path, *_):
        raise PermissionError(13, f"cannot write {path}")

    monkeypatch.setattr("scission.forecast.calibration.write_whole", refuse)

    assert learnt(results).n_records == 20
    assert "cannot be kept" in capsys.readouterr().err


def test_points_that_compute_nothing_teach_nothing():
    """A point without correlation copies its reference."""
    with pytest.raises(KeyError):
        expectation(work(WATER, correlation="none"))


@pytest.mark.parametrize(("cores", "seconds"), [(1, 9.0), (2, 7.0), (8, 7.0)])
def test_time_to_finish_respects_what_jobs_need(cores, seconds):
    """By hand: a (2 s) before b (5 s), c (2 s) free: 9 s in sequence, 7 s with two cores or more."""
    jobs = [job("a"), job("b", ["a"]), job("c")]

    assert makespan(jobs, [2.0, 5.0, 2.0], cores) == seconds


def test_a_plan_is_added_up(tmp_path):
    """Every planned calculation is in a line once; a level's own time is the law's, times its points."""
    plan = make_plan(load(changed(), tmp_path))
    forecast = estimate(plan)
    lines = {line.name: line for line in forecast.lines}
    items = [
        i for j in plan.jobs if j.stage == "correlate" for i in j.payload["points"] if i["level"] == "cc"
    ]
    started = lines["cc"].jobs * 3.0

    assert forecast.n_points == len(plan.points)
    assert forecast.total.jobs == len(plan.jobs)
    assert lines["cc"].calculations == len(items) == 40
    assert lines["cc"].core_s == pytest.approx(sum(expectation(i)[1] for i in items) + started)
    assert lines["cc"].low_s < lines["cc"].core_s < lines["cc"].high_s
    assert forecast.finish_s(10**6) <= forecast.finish_s(1)
    assert forecast.finish_s(1) == pytest.approx(forecast.total.core_s)


def test_each_reference_of_a_chain_cut_into_stages_counts_once(tmp_path):
    """Spine and blocks share the nodes; the last stage only mends."""
    plan = make_plan(load(changed(), tmp_path), block_seconds=1e-3)
    whole = make_plan(load(changed(), tmp_path))
    counted, known = (
        {line.name: line.calculations for line in estimate(p).lines if line.name.endswith("references")}
        for p in (plan, whole)
    )

    assert len([j for j in plan.jobs if j.stage == "reference"]) > len(
        [j for j in whole.jobs if j.stage == "reference"]
    )
    assert counted == known


def test_check_prints_the_forecast(tmp_path, capsys):
    """Core hours by level, memory, disk, and the time on the cores asked for."""
    path = tmp_path / "h2.yaml"
    path.write_text(H2)

    assert main(["check", str(path), "--cores", "3", "--results", str(tmp_path)]) == 0
    said = capsys.readouterr().out
    for words in (
        "core hours",
        "MB a job",
        "disk: about",
        "with 3 core(s)",
        "RHF references",
        "scaling laws",
    ):
        assert words in said


@pytest.mark.parametrize("command", ["check", "run"])
@pytest.mark.parametrize(("option", "limit"), [("--most-points", "11"), ("--most-core-hours", "1e-9")])
def test_a_campaign_above_a_limit_is_refused_and_the_limit_can_be_raised(
    tmp_path, capsys, command, option, limit
):
    """Exit status 2, nothing started, the option that raises the limit in the message."""
    path, results = tmp_path / "h2.yaml", tmp_path / "results"
    path.write_text(H2)

    assert main([command, str(path), option, limit, "--results", str(results)]) == 2
    assert option in capsys.readouterr().err
    assert not (results / "h2-check").exists()
    assert main(["check", str(path), option, "12", "--results", str(results)]) == 0


def test_the_law_of_references_is_finite_for_every_reference():
    """Ten functions to a thousand: seconds to days, never zero or infinite."""
    spec = work(HYDROGEN)["spec"]
    values = [reference_seconds(HYDROGEN, {**spec, "reference": r}) for r in ("RHF", "UHF", "CASSCF", "UKS")]

    assert all(0 < v < math.inf for v in values)
