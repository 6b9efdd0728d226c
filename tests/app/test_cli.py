"""The command: answers, exit codes, and one line for what is wrong."""

import io
import json
import os
import re
import subprocess
import sys
from importlib.metadata import version
from pathlib import Path

import pytest

import app.server
from app.cli import main
from engine import (
    critical_sparsity,
    lasso_boundary,
    power_limit,
    sorted_l1_boundary,
    two_level_boundary,
    two_level_closed_form,
)
from engine.demo import DEMO_STUDY, demo_points
from engine.shortlist import dump_shortlist

ROOT = Path(__file__).parents[2]
DEMO = str(ROOT / "assets" / "demo-study.json")
SHORTLIST = str(ROOT / "assets" / "demo-shortlist.json")
RATIOS = ["--sampling-ratio", "0.3", "--sparsity", "0.2"]
BOUNDARIES = {
    "lasso": lasso_boundary,
    "two_level_closed_form": two_level_closed_form,
    "two_level": two_level_boundary,
    "sorted_l1": sorted_l1_boundary,
}


@pytest.fixture
def run(capsys):
    def run_(*argv):
        code = main(list(argv))
        captured = capsys.readouterr()
        return code, captured.out, captured.err

    return run_


def test_limits_as_json(run):
    code, out, err = run("limits", *RATIOS, "--tpp", "0.5", "0.8", "--json")
    answer = json.loads(out)
    assert (code, err) == (0, "")
    assert list(answer) == [
        "sampling_ratio", "sparsity", "critical_sparsity", "power_limit", "points",
    ]  # fmt: skip
    assert (answer["sampling_ratio"], answer["sparsity"]) == (0.3, 0.2)
    assert answer["critical_sparsity"] == critical_sparsity(0.3)
    assert answer["power_limit"] == power_limit(0.3, 0.2)
    assert list(answer["points"][0]) == [
        "tpp", "lasso", "two_level_closed_form", "two_level", "sorted_l1",
    ]  # fmt: skip
    below, above = answer["points"]
    assert below == {"tpp": 0.5, **{key: f(0.5, 0.3, 0.2) for key, f in BOUNDARIES.items()}}
    assert above["lasso"] is None
    assert above["sorted_l1"] == sorted_l1_boundary(0.8, 0.3, 0.2)


def test_without_tpps_the_limits_are_those_at_tenths(run):
    _, out, _ = run("limits", *RATIOS, "--json")
    tenths = [0.1, 0.2, 0.3, 0.4, 0.5, 0.6, 0.7, 0.8, 0.9]
    points = json.loads(out)["points"]
    assert [point["tpp"] for point in points] == tenths
    # The power limit is 0.568.
    assert [point["lasso"] is None for point in points] == [False] * 5 + [True] * 4


def test_the_answer_is_one_line_of_json_without_nan(run):
    _, out, _ = run("limits", *RATIOS, "--tpp", "1", "--json")

    def refuse(word):
        raise AssertionError(word)

    assert out.count("\n") == 1
    assert json.loads(out, parse_constant=refuse)["points"][0]["lasso"] is None


def test_a_lasso_without_power_limit_has_a_number_at_every_tpp(run):
    argv = ["limits", "--sampling-ratio", "1e0", "--sparsity", ".2", "--tpp", "1", "--json"]
    answer = json.loads(run(*argv)[1])
    assert (answer["critical_sparsity"], answer["power_limit"]) == (1.0, 1.0)
    assert answer["points"][0]["lasso"] == lasso_boundary(1.0, 1.0, 0.2)


def test_the_ratios_of_a_file_are_its_counts(run):
    answer = json.loads(run("limits", DEMO, "--json")[1])
    assert (answer["sampling_ratio"], answer["sparsity"]) == (600 / 2000, 400 / 2000)


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
    (tmp_path / "s.json").write_bytes(b"\xef\xbb\xbf" + json.dumps(study).encode())
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
        (["limits", DEMO, *RATIOS], "--sampling-ratio must not be given together with FILE"),
        (["limits", "--sparsity", "0.2"], "--sampling-ratio must be given, or a study FILE"),
        (["limits", "--tpp", "0.5"], "--sampling-ratio must be given, or a study FILE"),
        (["limits", *RATIOS, "--tpp"], "--tpp: expected at least one argument"),
        (["limits", *RATIOS, "--tpp", "0.5", "high"], "--tpp must be .*, not 'high'"),
        (["limits", *RATIOS, "--tpp", "0.5", "1.1"], "--tpp must be .* at most 1, not 1.1"),
        (["limits", *RATIOS, "--tpp", "-0.5"], "--tpp must be .* above 0 .*, not -0.5"),
        (["limits", *RATIOS, "--tpp", "nan"], "--tpp must be a finite number .*, not nan"),
        (
            ["limits", "--sampling-ratio", "1e400", "--sparsity", "0.2"],
            "--sampling-ratio must be a finite number above 0, not inf",
        ),
        (
            ["limits", "--sampling-ratio", "0", "--sparsity", "0.2"],
            "--sampling-ratio must be a finite number above 0, not 0",
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
        (
            ["limits", str(ROOT)],
            f"{re.escape(str(ROOT))} must be a readable file: Is a directory",
        ),
        ([""], "FILE must be the name of a file, not ''"),
        (["limits", ""], "FILE must be the name of a file, not ''"),
        (["limits", "two\nlines"], "two lines must be a readable file: No such file"),
        (["shortlist", "check", "none.json"], "none.json must be a readable file: No such"),
        (["shortlist", "check", str(ROOT)], "must be a readable file: Is a directory"),
        (["shortlist", "check"], "the following arguments are required: FILE"),
        (["shortlist", "check", SHORTLIST, "more"], "unrecognized arguments: more"),
        (["limits", DEMO, "--speed"], "unrecognized arguments: --speed"),
        (["limits", SHORTLIST], "schema must be 'sparsereach/study/1'"),
        (["shortlist", "check", DEMO], "schema must be 'sparsereach/shortlist/1'"),
        (["shortlist", "mend", DEMO], "invalid choice: 'mend'"),
        (["shortlist"], "the following arguments are required"),
        (["none.json"], "none.json must be a readable file: No such file or directory"),
        ([str(ROOT)], "must be a readable file: Is a directory"),
        (
            [SHORTLIST],
            f"{re.escape(SHORTLIST)}: schema must be 'sparsereach/study/1', not 'sparsereach/s",
        ),
        (["--port", "0"], "must be a whole number from 1 to 65535, not '0'"),
        (["--port", "http"], "must be a whole number from 1 to 65535, not 'http'"),
        ([DEMO, DEMO], "unrecognized arguments: "),
        (["--port", "70000"], "must be a whole number from 1 to 65535, not '70000'"),
        (["--colour"], "unrecognized arguments: --colour"),
    ],
)
def test_bad_input_ends_with_2_and_one_line(run, argv, message):
    code, out, err = run(*argv)
    assert (code, out) == (2, "")
    assert err.startswith("sparsereach: ")
    assert err.count("\n") == 1
    assert re.search(message, err)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "study file must be JSON: Expecting value at line 1, column 1"),
        (b"[]", r"study file must be a JSON object, not \[\]"),
        (b"\xff{}", r"study file must be UTF-8, not other bytes \(at byte 0\)"),
        (b'{"runs": 1, "runs": 2}', "'runs' must be given once, not twice in one object"),
        (b'{"runs": NaN}', "numbers must be finite, not NaN"),
        (b'{"runs": 9' + b"9" * 5000 + b"}", "numbers must have at most 500 digits, not 5001"),
        (b'{"runs": ' + b"[" * 100_000, "study file must be nested at most 20 deep"),
        (
            DEMO_STUDY.dumps().replace('"runs"', '"rusn"').encode(),
            r"rusn must be a known key; did you mean runs\?",
        ),
        (
            DEMO_STUDY.dumps().replace('"runs"', '"ru\\nns"').encode(),
            r"ru\\nns must be a known key; did you mean runs\?",
        ),
        (
            DEMO_STUDY.dumps().replace("600", "true").encode(),
            "runs must be a whole number at least 1 and at most 1000000000, not True",
        ),
        (
            DEMO_STUDY.dumps().replace("0.16", "1e400").encode(),
            r"effects\[0\].size must be a finite nonzero number, not inf",
        ),
    ],
)
@pytest.mark.parametrize("command", [[], ["limits"]], ids=["dashboard", "limits"])
def test_a_bad_study_ends_with_2_and_one_line_that_names_file_and_field(
    run, tmp_path, command, content, message
):
    file = tmp_path / "study.json"
    file.write_bytes(content)
    code, out, err = run(*command, str(file))
    assert (code, out) == (2, "")
    assert re.fullmatch(f"sparsereach: {re.escape(str(file))}: {message}\n", err)


def test_a_bad_shortlist_is_named_at_its_place(run, tmp_path):
    points = [point.data for point in demo_points()]
    points[2] = {**points[2], "study": {**points[2]["study"], "actives": 2000}}
    file = tmp_path / "shortlist.json"
    file.write_text(json.dumps({"schema": "sparsereach/shortlist/1", "points": points}))
    code, out, err = run("shortlist", "check", str(file), "--json")
    assert (code, out) == (2, "")
    place = "points[2].study.actives must be smaller than candidates (2000), not 2000"
    assert err == f"sparsereach: {file}: {place}\n"


def test_a_file_too_large_is_not_read(run, tmp_path):
    (tmp_path / "big.json").write_bytes(b" " * 1_000_001)
    code, _, err = run("limits", str(tmp_path / "big.json"))
    assert code == 2
    assert err == (
        f"sparsereach: {tmp_path / 'big.json'} must be at most 1,000,000 bytes, not 1,000,001\n"
    )


def test_shortlist_check(run):
    assert run("shortlist", "check", SHORTLIST)[:2] == (0, f"{SHORTLIST}: sound, 3 points\n")
    code, out, _ = run("shortlist", "check", SHORTLIST, "--json")
    assert (code, json.loads(out)) == (0, {"points": 3})


def test_shortlist_check_counts_in_words(run, tmp_path):
    for count, words in ((0, "0 points"), (1, "1 point"), (2, "2 points")):
        file = tmp_path / f"{count}.json"
        file.write_text(dump_shortlist(demo_points()[:count]), encoding="utf-8")
        assert run("shortlist", "check", str(file)) == (0, f"{file}: sound, {words}\n", "")


def test_a_file_name_that_the_output_cannot_hold_is_escaped(tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    points = dump_shortlist(demo_points())
    for encoding, name, shown in (
        ("ascii", "r\xe9serve.json", rb"r\xe9serve.json"),
        ("utf-8", "r\xe9serve.json", "r\xe9serve.json".encode()),
        ("utf-8", "\udcff.json", rb"\udcff.json"),  # a byte that is not UTF-8
    ):
        try:
            Path(name).write_text(points, encoding="utf-8")
        except OSError:  # some file systems hold no such names
            continue
        out = io.TextIOWrapper(io.BytesIO(), encoding=encoding)
        monkeypatch.setattr(sys, "stdout", out)
        assert main(["shortlist", "check", name]) == 0
        assert out.buffer.getvalue() == shown + b": sound, 3 points\n"


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


def test_a_dashboard_that_cannot_be_opened_ends_with_1(run, monkeypatch):
    monkeypatch.setattr(app.server, "serve", lambda *_, **__: 1)
    assert run("--no-browser") == (1, "", "")

    def interrupted(*_, **__):
        raise KeyboardInterrupt

    monkeypatch.setattr(app.server, "serve", interrupted)
    assert run("--no-browser") == (1, "", "")


def test_a_file_named_like_a_command_is_opened_by_its_path(run, tmp_path, monkeypatch):
    monkeypatch.chdir(tmp_path)
    (tmp_path / "limits").write_text(DEMO_STUDY.dumps())
    seen = []
    monkeypatch.setattr(app.server, "serve", lambda study, **_: seen.append(study) or 0)
    assert run("./limits")[0] == 0
    assert run("--no-browser", "--", "limits")[0] == 0
    assert seen == [DEMO_STUDY, DEMO_STUDY]
    assert json.loads(run("limits", "limits", "--json")[1])["points"][0]["tpp"] == 0.8


@pytest.mark.parametrize(
    ("argv", "words"),
    [
        (["--help"], ["--port", "--no-browser", "limits", "shortlist"]),
        (
            ["limits", "--help"],
            ["--sampling-ratio", "--sparsity", "--tpp", "--json", "above 0"],
        ),
        (["limits", "-h"], ["lowest FDP", "FILE", "at most 1", "below 1"]),
        (["shortlist", "--help"], ["check", "FILE", "--json"]),
        (["--version"], [version("sparsereach")]),
    ],
)
def test_help_and_version(capsys, monkeypatch, argv, words):
    monkeypatch.setenv("COLUMNS", "200")  # so that no phrase is broken over two lines
    with pytest.raises(SystemExit) as end:
        main(argv)
    assert end.value.code == 0
    out, err = capsys.readouterr()
    assert [word for word in words if word not in out] == []
    assert err == ""


def test_the_help_names_the_other_commands_and_each_has_its_own(capsys):
    with pytest.raises(SystemExit):
        main(["--help"])
    listed = re.search(r"other commands: ([^(]*)", capsys.readouterr().out)[1]
    commands = [word.strip() for word in listed.split(",")]
    assert commands == ["limits", "predict", "shortlist", "atlas"]
    for command in commands:
        with pytest.raises(SystemExit):
            main([command, "--help"])
        assert f"usage: sparsereach {command} " in capsys.readouterr().out


def test_limits_needs_no_picture_packages():
    code = (
        "import sys; from app.cli import main; code = main(sys.argv[1:]);"
        "print({'panel', 'bokeh', 'param', 'tornado'} & set(sys.modules), file=sys.stderr);"
        "sys.exit(code)"
    )
    command = [sys.executable, "-c", code, "limits", DEMO, "--json"]
    done = subprocess.run(command, cwd=ROOT, capture_output=True, text=True)
    assert (done.returncode, done.stderr) == (0, "set()\n")
    assert json.loads(done.stdout)["points"]


@pytest.mark.parametrize(
    ("device", "code", "message"),
    [
        ("pipe", 0, ""),  # its reader has seen enough
        ("/dev/full", 1, "sparsereach: No space left on device\n"),
    ],
)
def test_output_that_cannot_be_written(device, code, message):
    if device == "pipe":
        reader, writer = os.pipe()
        os.close(reader)
    elif Path(device).exists():
        writer = os.open(device, os.O_WRONLY)
    else:
        pytest.skip("no full device here")
    # Buffered, as in a shell: what is written late must not fail at exit.
    surroundings = {key: value for key, value in os.environ.items() if "UNBUFFERED" not in key}
    command = [sys.executable, "-m", "app.cli", "limits", DEMO, "--tpp", "0.5"]
    try:
        done = subprocess.run(
            command, cwd=ROOT, env=surroundings, stdout=writer, stderr=subprocess.PIPE,
            text=True,
        )  # fmt: skip
    finally:
        os.close(writer)
    assert (done.returncode, done.stderr) == (code, message)
