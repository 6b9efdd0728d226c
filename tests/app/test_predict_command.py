"""`sparsereach predict`: its answer, its honest none, and one line for what is wrong."""

import json
import math
from pathlib import Path

import pytest

from app.cli import main
from engine import predict
from engine.demo import DEMO_STUDY
from engine.study import Spread, Study

DEMO = str(Path(__file__).parents[2] / "assets" / "demo-study.json")


@pytest.fixture
def run(capsys):
    def run_(*argv):
        code = main(["predict", *argv])
        captured = capsys.readouterr()
        return code, captured.out, captured.err

    return run_


def test_the_answer_as_json(run):
    code, out, err = run(DEMO, "--penalty", "lasso", "--fdp", "0.3", "--json")
    answer = json.loads(out)
    want = predict(DEMO_STUDY, "lasso", fdp=0.3)
    assert (code, err) == (0, "")
    assert list(answer) == [
        "tpp", "fdp", "zero_threshold", "cut", "lambda", "lambda_per_run", "tau", "mse",
        "list_size", "by_effect", "spread", "reason",
    ]  # fmt: skip
    assert (answer["tpp"], answer["lambda"], answer["tau"]) == (want.tpp, want.lam, want.tau)
    assert answer["lambda_per_run"] == pytest.approx(want.lam / math.sqrt(600))
    assert answer["cut"] is None
    assert answer["reason"] is None
    assert [effect["size"] for effect in answer["by_effect"]] == [0.16, 0.32]
    assert list(answer["spread"]) == ["tpp", "fdp"]


def test_without_a_goal_the_target_of_the_file_counts(run):
    argv = (DEMO, "--penalty", "designed", "--json")
    assert json.loads(run(*argv)[1]) == json.loads(run(*argv, "--fdp", "0.75")[1])


def test_an_honest_none(run):
    code, out, err = run(DEMO, "--penalty", "lasso", "--tpp", "0.95", "--json")
    answer = json.loads(out)
    assert (code, err) == (0, "")
    assert "TPP 0.95 is outside" in answer["reason"]
    assert answer["tpp"] is answer["lambda"] is answer["spread"]["fdp"] is None
    assert answer["by_effect"] == [{"size": 0.16, "tpp": None}, {"size": 0.32, "tpp": None}]


def test_parameters_reach_the_penalty(run, tmp_path):
    weights = tmp_path / "weights.csv"
    weights.write_text("3\n2\n1\n")
    for options, stated in [
        (["--penalty", "two-level", "--levels", "2", "1.5", "--share", "0.1"],
         {"levels": (2.0, 1.5), "share": 0.1}),
        (["--penalty", "ramp", "--ramp-level", "0.2"], {"ramp_level": 0.2}),
        (["--penalty", "weights", "--weights", str(weights)], {"weights": [3, 2, 1]}),
    ]:  # fmt: skip
        _, out, _ = run(DEMO, *options, "--fdp", "0.3", "--json")
        assert json.loads(out)["tpp"] == predict(DEMO_STUDY, options[1], fdp=0.3, **stated).tpp


def test_two_stages_with_a_stated_strength(run):
    argv = ["--penalty", "lasso", "--selection", "two-stage", "--lambda", "3", "--fdp", "0.3"]
    answer = json.loads(run(DEMO, *argv, "--json")[1])
    assert answer["lambda"] == pytest.approx(3.0)
    assert answer["fdp"] == pytest.approx(0.3)
    assert answer["cut"] > 0.0


def test_for_people(run, tmp_path):
    study = tmp_path / "study.json"
    spread = Study("", 600, 2000, 100, 1.0, (Spread("normal", 0.2, 1.0),))
    study.write_text(spread.dumps())
    _, out, _ = run(str(study), "--penalty", "two-level", "--fdp", "0.3")
    for words in ("TPP of normal 0.2", "list size", "levels, in tau", "iid Gaussian columns"):
        assert words in out


@pytest.mark.parametrize(
    ("argv", "words"),
    [
        ([], "--penalty must be given"),
        (["--penalty", "ridge"], "penalty must be one of lasso"),
        (["--penalty", "lasso", "--fdp", "2"], "--fdp must be a finite number above 0"),
        (["--penalty", "lasso", "--fdp", "x"], "--fdp must be"),
        (["--penalty", "lasso", "--lambda", "0"], "--lambda must be a finite number above 0"),
        (["--penalty", "lasso", "--fdp", ".2", "--tpp", ".2"], "one of fdp, tpp and lam must"),
        (["--penalty", "lasso", "--share", ".2"], "share must be left out for lasso"),
        (["--penalty", "two-level", "--share", ".2"], "levels must be given"),
        (["--penalty", "two-level", "--levels", "1", "2", "--share", ".2"], "levels must fall"),
        (["--penalty", "ramp", "--ramp-level", "1"], "--ramp-level must be"),
        (["--penalty", "weights"], "weights must be given"),
        (["--penalty", "weights", "--weights", "no such file"], "must be a readable file"),
        (["--penalty", "lasso", "--selection", "all"], "selection must be one of nonzero"),
    ],
)
def test_bad_input_is_one_line_and_exit_code_2(run, argv, words):
    code, out, err = run(DEMO, *argv)
    assert (code, out) == (2, "")
    assert words in err
    assert err.count("\n") == 1
