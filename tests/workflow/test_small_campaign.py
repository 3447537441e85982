"""A real campaign from the command to the tables, undisturbed and with failures."""

import subprocess
import sys

import pytest
from scission.records.store import Store
from small_campaign import COSTS


def test_a_campaign_without_trouble_ends_with_0_and_one_row_a_point(finished):
    """Two levels of six geometries: twelve rows, all good, each computed once; the places are told."""
    rows = finished.rows()

    assert finished.process.returncode == 0, finished.process.stderr
    assert len(rows) == 12
    assert {(row["status"], row["attempts"]) for row in rows} == {("converged", "1")}
    assert finished.rows("failures.csv") == []
    assert "12 points, 12 with a result" in finished.process.stdout


def test_the_engines_command_is_told(finished):
    """Whoever wants to can run it without this program."""
    assert "-m snakemake --snakefile" in finished.process.stderr


def test_energies_equal_those_of_direct_calls_of_the_engine(finished):
    """CCSD is exact for two electrons: equal to PySCF's own CCSD and full CI at the same geometry."""
    from pyscf import cc, fci, gto, scf

    mole = gto.M(atom=[("H", (0, 0, 0)), ("H", (0, 0, 0.9))], basis="sto-3g", verbose=0)
    field = scf.RHF(mole).run(conv_tol=1e-12)
    here = {
        r["level"]: float(r["energy_hartree"]) for r in finished.rows() if r["coordinate_angstrom"] == "0.9"
    }

    assert here["hf"] == pytest.approx(field.e_tot, abs=1e-8)
    assert here["cc"] == pytest.approx(cc.CCSD(field).run(conv_tol=1e-10).e_tot, abs=1e-7)
    assert here["cc"] == pytest.approx(fci.FCI(field).kernel()[0], abs=1e-7)


def test_a_second_run_computes_nothing(finished):
    """No record and no summary of a job is written again; the end is the same."""
    before = finished.changed()
    again = finished.run()

    assert again.returncode == 0
    assert finished.changed() == before
    assert again.stdout == finished.process.stdout


def test_the_engines_own_command_works_too(finished, project):
    """snakemake with the local profile finds everything done."""
    words = ["--profile", str(project / "config/profiles/local"), "--configfile", str(finished.file)]
    words += ["--config", f"results={finished.results}", "-s", str(project / "Snakefile")]
    done = finished.finish([sys.executable, "-m", "snakemake", *words])

    assert done.returncode == 0, done.stderr
    assert "Nothing to be done" in done.stderr


def test_the_engine_shows_a_wrong_campaign_with_all_its_problems(campaign, project):
    """The bare engine, too, says where, what and why, and starts nothing."""
    campaign.file.write_text(campaign.file.read_text().replace("sto-3g", "sto-99g"))
    words = ["--profile", str(project / "config/profiles/local"), "--configfile", str(campaign.file)]
    words += ["--config", f"results={campaign.results}", "-s", str(project / "Snakefile")]
    done = campaign.finish([sys.executable, "-m", "snakemake", *words])

    assert done.returncode != 0
    assert "levels.hf.basis" in done.stderr
    assert "levels.cc.basis" in done.stderr
    assert not campaign.results.exists()


def test_status_counts_what_is_there(finished):
    """All good, nothing at work."""
    shown = finished.finish(finished.command("status", str(finished.layout.folder))).stdout

    assert "bond  cc          6     6         0     0" in shown
    assert "at work: nothing" in shown


def test_failed_points_are_listed_and_a_retry_heals_exactly_the_listed_ones(campaign):
    """Exit 3 and a row each; a list without one of the rows leaves that point alone; all others stay."""
    bad = [campaign.key("cc", n) for n in (2, 5)]
    first = campaign.run(drill=dict.fromkeys(bad, "raise"))

    assert first.returncode == 3, first.stderr
    listed = campaign.rows("failures.csv")
    assert [(row["key"], row["reason"], row["attempts"]) for row in listed] == [
        (k, "raised", "1") for k in bad
    ]
    assert len(campaign.rows()) == 12

    text = campaign.layout.failures.read_text().splitlines(keepends=True)
    campaign.layout.failures.write_text("".join(text[:2]))
    before = {
        k: v for k, v in campaign.changed().items() if bad[0] not in k.name and "correlate" not in k.name
    }
    second = campaign.retry()
    after = campaign.changed()

    assert second.returncode == 3, second.stderr
    assert [row["key"] for row in campaign.rows("failures.csv")] == [bad[1]]
    assert {k: after[k] for k in before} == before
    healed = next(row for row in campaign.rows() if row["key"] == bad[0])
    assert (healed["status"], healed["attempts"]) == ("converged", "2")
    assert campaign.retry().returncode == 0


@pytest.mark.slow
def test_a_failed_reference_skips_its_points_and_heals_with_them(campaign, finished):
    """The reference's failure is the failure of its points; a retry computes it and what hangs on it."""
    key = campaign.key("cc", 6, "reference_key")
    first = campaign.run(drill={key: "raise"})
    listed = {(r["level"], r["point"]): (r["stage"], r["status"]) for r in campaign.rows("failures.csv")}

    assert first.returncode == 3, first.stderr
    assert listed[("hf", "6")] == ("reference", "failed")
    assert listed[("cc", "6")][1] == "skipped"
    assert campaign.retry().returncode == 0
    drop = (*COSTS, "attempts", "remedy")
    assert campaign.rows(without=drop) == finished.rows(without=drop)


@pytest.mark.slow
def test_adding_points_computes_only_those(campaign):
    """Records that are there stay as they are."""
    campaign.run()
    records = {p: t for p, t in campaign.changed().items() if "records" in p.parts or "references" in p.parts}
    campaign.file.write_text(campaign.file.read_text().replace("2.0]", "2.0, 2.5]"))
    again = campaign.run()
    after = campaign.changed()

    assert again.returncode == 0, again.stderr
    assert len(campaign.rows()) == 14
    assert {p: after[p] for p in records} == records


def test_the_campaigns_path_is_relative_to_the_caller_and_home_stays_empty(finished, tmp_path):
    """A run from another folder finds its file there, and nothing outside project and results changes."""
    home = tmp_path / "home"
    home.mkdir()
    words = finished.command("run", finished.file.name, "--results", "results")
    environment = finished.environment(HOME=str(home))
    done = subprocess.run(words, env=environment, cwd=finished.file.parent, capture_output=True, check=False)

    assert done.returncode == 0, done.stderr
    assert list(home.rglob("*")) == []


def test_two_levels_share_their_references(finished):
    """Twelve points hang on six references, one a geometry."""
    used = {Store(finished.layout.folder).read("point", row["key"]).reference_key for row in finished.rows()}

    assert len({row["key"] for row in finished.rows()}) == 12
    assert len(used) == 6
