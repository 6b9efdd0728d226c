"""The command: answers, exit codes, and one line for what is wrong."""

import json
import subprocess
import sys
from pathlib import Path

import pytest

import app.server
from app.cli import main
from engine import lasso_boundary, power_limit, sorted_l1_boundary
from engine.demo import DEMO_STUDY

ROOT = Path(__file__).parents[2]
DEMO = str(ROOT / "assets" / "demo-study.json")
SHORTLIST = str(ROOT / "assets" / "demo-shortlist.json")


@pytest.fixture
def run(capsys):
    def run_(*argv):
        code = main(list(argv))
        captured = capsys.readouterr()
        return code, captured.out, captured.err

    return run_


def test_limits_as_json(run):
    code, out, err = run(
        "limits",
        "--sampling-ratio",
        "0.3",
        "--sparsity",
        "0.2",
        "--tpp",
        "0.5",
        "0.8",
        "--json",
    )
    answer = json.loads(out)
    assert (code, err) == (0, "")
    assert list(answer) == [
        "sampling_ratio", "sparsity", "critical_sparsity", "power_limit", "points",
    ]  # fmt: skip
    assert answer["power_limit"] == power_limit(0.3, 0.2)
    assert list(answer["points"][0]) == [
        "tpp", "lasso", "two_level_closed_form", "two_level", "sorted_l1",
    ]  # fmt: skip
    assert answer["points"][0]["lasso"] == lasso_boundary(0.5, 0.3, 0.2)
    assert answer["points"][1]["lasso"] is None
    assert answer["points"][1]["sorted_l1"] == sorted_l1_boundary(0.8, 0.3, 0.2)


def test_limits_as_a_table(run):
    code, out, _ = run("limits", "--sampling-ratio", "0.3", "--sparsity", "0.2")
    lines = out.splitlines()
    assert code == 0
    assert [line.split()[0] for line in lines[5:14]] == [f"0.{i}00000" for i in range(1, 10)]
    assert "none" in lines[10]
    assert "iid Gaussian" in lines[-1]


def test_the_target_of_a_file_counts_unless_tpps_are_given(run, tmp_path):
    _, out, _ = run("limits", DEMO, "--json")
    assert [point["tpp"] for point in json.loads(out)["points"]] == [0.8]
    _, out, _ = run("limits", DEMO, "--tpp", "0.1", "--tpp", "0.2", "0.3", "--json")
    assert [point["tpp"] for point in json.loads(out)["points"]] == [0.1, 0.2, 0.3]
    study = DEMO_STUDY.to_dict()
    del study["target"]
    (tmp_path / "s.json").write_text(json.dumps(study))
    _, out, _ = run("limits", str(tmp_path / "s.json"), "--json")
    assert len(json.loads(out)["points"]) == 9


@pytest.mark.parametrize(
    ("argv", "message"),
    [
        (["limits"], "--sampling-ratio must be given, or a study FILE"),
        (["limits", "--sampling-ratio", "0.3"], "--sparsity must be given, or a study FILE"),
        (
            ["limits", DEMO, "--sparsity", "0.2"],
            "--sparsity must not be given together with FILE",
        ),
        (
            ["limits", "--sampling-ratio", "x", "--sparsity", "0.2"],
            "--sampling-ratio must be a finite number above 0, not 'x'",
        ),
        (
            ["limits", "--sampling-ratio", "1", "--sparsity", "1"],
            "--sparsity must be a finite number above 0 and below 1, not 1",
        ),
        (
            ["limits", DEMO, "--tpp", "0"],
            "--tpp must be a finite number above 0 and at most 1, not 0",
        ),
        (
            ["limits", "none.json"],
            "none.json must be a readable file: No such file or directory",
        ),
        (["limits", str(ROOT)], f"{ROOT} must be a readable file: Is a directory"),
        (["limits", DEMO, "--speed"], "unrecognized arguments: --speed"),
        (["limits", SHORTLIST], "schema must be 'sparsereach/study/1'"),
        (["shortlist", "check", DEMO], "schema must be 'sparsereach/shortlist/1'"),
        (["shortlist", "mend", DEMO], "invalid choice: 'mend'"),
        (["shortlist"], "the following arguments are required"),
        (["none.json"], "none.json must be a readable file"),
        (["--port", "70000"], "must be a whole number from 1 to 65535, not '70000'"),
        (["--colour"], "unrecognized arguments: --colour"),
    ],
)
def test_bad_input_ends_with_2_and_one_line(run, argv, message):
    code, out, err = run(*argv)
    assert (code, out) == (2, "")
    assert err.startswith("sparsereach: ")
    assert err.count("\n") == 1
    assert message in err


def test_a_file_too_large_is_not_read(run, tmp_path):
    (tmp_path / "big.json").write_bytes(b" " * 1_000_001)
    code, _, err = run("limits", str(tmp_path / "big.json"))
    assert code == 2
    assert "must be at most 1,000,000 bytes, not 1,000,001" in err


def test_shortlist_check(run):
    assert run("shortlist", "check", SHORTLIST)[:2] == (0, f"{SHORTLIST}: sound, 3 points\n")
    code, out, _ = run("shortlist", "check", SHORTLIST, "--json")
    assert (code, json.loads(out)) == (0, {"points": 3})


def test_the_dashboard_is_opened_on_a_checked_study(run, monkeypatch):
    calls = []

    def serve(*args, **kwargs):
        calls.append((args, kwargs))
        return 0

    monkeypatch.setattr(app.server, "serve", serve)
    assert run(DEMO, "--port", "8123", "--no-browser")[0] == 0
    assert run()[0] == 0
    assert calls == [
        ((DEMO_STUDY,), {"port": 8123, "browser": False}),
        ((None,), {"port": None, "browser": True}),
    ]


def test_a_file_named_like_a_command_is_opened_by_its_path(run, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "limits").write_text(DEMO_STUDY.dumps())
    seen = []
    monkeypatch.setattr(app.server, "serve", lambda study, **_: seen.append(study) or 0)
    assert run("./limits")[0] == 0
    assert seen == [DEMO_STUDY]


@pytest.mark.parametrize(
    ("argv", "words"),
    [
        (["--help"], ["--port", "--no-browser", "limits", "shortlist"]),
        (
            ["limits", "--help"],
            ["--sampling-ratio", "--sparsity", "--tpp", "--json", "above 0"],
        ),
        (["shortlist", "--help"], ["check", "FILE"]),
        (["--version"], ["0.1.0"]),
    ],
)
def test_help_and_version(capsys, argv, words):
    with pytest.raises(SystemExit) as end:
        main(argv)
    assert end.value.code == 0
    out = capsys.readouterr().out
    assert all(word in out for word in words)


def test_limits_needs_no_picture_packages_and_bears_a_closed_pipe():
    code = (
        "import sys; from app.cli import main; main(sys.argv[1:]);"
        "assert not {'panel', 'bokeh', 'param'} & set(sys.modules)"
    )
    command = [sys.executable, "-c", code, "limits", DEMO]
    assert subprocess.run(command, cwd=ROOT, capture_output=True).returncode == 0
    script = (
        f"{sys.executable} -m app.cli limits {DEMO} --tpp 0.5 | true; echo ${{PIPESTATUS[0]}}"
    )
    done = subprocess.run(["bash", "-c", script], cwd=ROOT, capture_output=True, text=True)
    assert done.stdout.strip() == "0"
    assert "Traceback" not in done.stderr
