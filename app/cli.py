"""The command: `sparsereach [FILE]` opens the dashboard, other words answer in the terminal.

A subcommand is one function here that adds its parser and one that carries it out. Answers go
to stdout, everything else to stderr. Exit codes: 0 done, 2 bad input, 1 failed.
"""

import argparse
import json
import math
import os
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any, NoReturn

import numpy as np

from app.atlas_command import add_atlas, atlas
from app.predict_command import WEIGHTS_BYTES, add_predict, answer_of, forecast, table_of
from engine.files import SHORTLIST_BYTES, STUDY_BYTES
from engine.limits.families import FAMILIES
from engine.limits.transition import critical_sparsity, power_limit
from engine.quantities import SAMPLING_RATIO, SPARSITY, TPP, Quantity
from engine.shortlist import LIMIT_KEYS, load_shortlist
from engine.study import Study, load_study
from engine.version import VERSION

__all__ = ["main"]

CAUTION = (
    "Large-sample limits for iid Gaussian columns; a finite study strays. Where a decision can "
    "hurt someone, a qualified statistician and local rules decide."
)

_DEFAULT_TPP = [round(0.1 * i, 1) for i in range(1, 10)]


class InputError(Exception):
    """What the user gave is wrong; the message is one line."""


def main(argv: list[str] | None = None) -> int:
    """Run the command and return its exit code."""
    arguments = sys.argv[1:] if argv is None else argv
    try:
        try:
            return _run(arguments)
        finally:
            print(end="", flush=True)  # what cannot be written shows here, not at exit
    except InputError as error:
        line = " ".join(str(error).split())
        print(f"sparsereach: {line}", file=sys.stderr)
        return 2
    except BrokenPipeError:  # the reader of our output has gone
        _discard_output()
        return 0
    except OSError as error:
        _discard_output()
        print(f"sparsereach: {error.strerror or error}", file=sys.stderr)
        return 1
    except KeyboardInterrupt:
        return 1


def _discard_output() -> None:
    os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())


def _run(arguments: list[str]) -> int:
    first = next((word for word in arguments if not word.startswith("-")), None)
    if first in _COMMANDS and arguments[0] == first:
        add, carry_out = _COMMANDS[first]
        parser = _Parser(prog=f"sparsereach {first}", description=carry_out.__doc__)
        add(parser)
        return carry_out(parser.parse_args(arguments[1:]))
    return _open_dashboard(_main_parser().parse_args(arguments))


class _Parser(argparse.ArgumentParser):
    def __init__(self, **options: Any) -> None:
        super().__init__(allow_abbrev=False, **options)

    def error(self, message: str) -> NoReturn:
        raise InputError(message)


def _main_parser() -> argparse.ArgumentParser:
    parser = _Parser(
        prog="sparsereach",
        description="Open the dashboard in a browser, on FILE or on an empty study.",
        epilog=(
            f"other commands: {', '.join(_COMMANDS)} (each with --help); a file that is named "
            "like one of them is opened as ./NAME"
        ),
    )
    parser.add_argument("file", nargs="?", metavar="FILE", help="study file (JSON)")
    parser.add_argument("--port", type=_port, help="port on this machine; default any free one")
    parser.add_argument("--no-browser", action="store_true", help="only print the address")
    parser.add_argument("--version", action="version", version=VERSION)
    return parser


def _port(text: str) -> int:
    if not text.isdecimal() or not 1 <= int(text) <= 65535:
        raise argparse.ArgumentTypeError(
            f"must be a whole number from 1 to 65535, not {text!r}"
        )
    return int(text)


def _open_dashboard(options: argparse.Namespace) -> int:
    study = None if options.file is None else _study(options.file)
    from app.server import serve  # the dashboard's packages take a second to import

    return serve(study, port=options.port, browser=not options.no_browser)


# ---- limits


def _add_limits(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("file", nargs="?", metavar="FILE", help="study file (JSON)")
    for quantity in (SAMPLING_RATIO, SPARSITY):
        parser.add_argument(quantity.option, metavar="X", help=_help(quantity))
    parser.add_argument(TPP.option, nargs="+", action="extend", metavar="U", help=_help(TPP))
    parser.add_argument("--json", action="store_true", help="print one JSON object")


def _limits(options: argparse.Namespace) -> int:
    """Print the lowest FDP of each penalty at given TPPs, whatever the signal."""
    delta, eps, tpp = _limits_input(options)
    boundaries = {
        key: FAMILIES[family].boundary(tpp, delta, eps).tolist()
        for key, family in LIMIT_KEYS.items()
    }
    answer = {
        "sampling_ratio": delta,
        "sparsity": eps,
        "critical_sparsity": critical_sparsity(delta),
        "power_limit": power_limit(delta, eps),
        "points": [
            {"tpp": u, **{key: _or_none(fdp[i]) for key, fdp in boundaries.items()}}
            for i, u in enumerate(tpp.tolist())
        ],
    }
    print(json.dumps(answer) if options.json else _limits_table(answer))
    return 0


def _limits_input(options: argparse.Namespace) -> tuple[float, float, Any]:
    ratios = {q: getattr(options, q.name) for q in (SAMPLING_RATIO, SPARSITY)}
    given = [q for q, text in ratios.items() if text is not None]
    target = None
    if options.file is not None:
        if given:
            raise InputError(f"{given[0].option} must not be given together with FILE")
        study = _study(options.file)
        delta, eps, target = study.sampling_ratio, study.sparsity, study.target
    else:
        for quantity in ratios:
            if quantity not in given:
                raise InputError(f"{quantity.option} must be given, or a study FILE")
        delta, eps = (_number(quantity, text) for quantity, text in ratios.items())
    if options.tpp is not None:
        tpp = [_number(TPP, text) for text in options.tpp]
    else:
        tpp = _DEFAULT_TPP if target is None else [target.tpp]
    return delta, eps, np.array(tpp)


def _limits_table(answer: dict[str, Any]) -> str:
    lines = [
        f"sampling ratio {answer['sampling_ratio']:.6g}, sparsity {answer['sparsity']:.6g}",
        f"critical sparsity {answer['critical_sparsity']:.6g}, "
        f"power limit of the lasso {answer['power_limit']:.6g}",
        "",
        "lowest FDP, whatever the signal:",
    ]
    columns = list(answer["points"][0])
    lines.append("  ".join(f"{name:>{_width(name)}}" for name in columns))
    for point in answer["points"]:
        cells = ("none" if value is None else f"{value:.6f}" for value in point.values())
        names_cells = zip(columns, cells, strict=True)
        lines.append("  ".join(f"{cell:>{_width(name)}}" for name, cell in names_cells))
    return "\n".join([*lines, "", CAUTION])


def _width(name: str) -> int:
    return max(len(name), 8)


def _or_none(value: float) -> float | None:
    return None if math.isnan(value) else value


# ---- predict


def _predict(options: argparse.Namespace) -> int:
    """Predict what a penalty and a selection rule find in a study."""
    study = _study(options.file)
    weights = None
    if options.weights is not None:
        weights = _checked(bytes, options.weights, WEIGHTS_BYTES)
    try:
        found = forecast(study, options, weights)
    except ValueError as error:
        raise InputError(str(error)) from None
    print(json.dumps(answer_of(found)) if options.json else f"{table_of(found)}\n\n{CAUTION}")
    return 0


# ---- shortlist


def _add_shortlist(parser: argparse.ArgumentParser) -> None:
    parser.add_argument("action", choices=["check"], help="check: say whether FILE is sound")
    parser.add_argument("file", metavar="FILE", help="shortlist file (JSON)")
    parser.add_argument("--json", action="store_true", help="print one JSON object")


def _shortlist(options: argparse.Namespace) -> int:
    """Check a shortlist file as the dashboard would on import."""
    points = _checked(load_shortlist, options.file, SHORTLIST_BYTES)
    if options.json:
        print(json.dumps({"points": len(points)}))
    else:
        words = "1 point" if len(points) == 1 else f"{len(points)} points"
        print(f"{_printable(options.file)}: sound, {words}")
    return 0


_COMMANDS: dict[str, tuple[Callable[..., None], Callable[..., int]]] = {
    "limits": (_add_limits, _limits),
    "predict": (add_predict, _predict),
    "shortlist": (_add_shortlist, _shortlist),
    "atlas": (add_atlas, atlas),
}


# ---- shared


def _help(quantity: Quantity) -> str:
    return f"{quantity.meaning}: {quantity.rule}"


def _number(quantity: Quantity, text: str) -> float:
    try:
        value: Any = (
            float(text) if "_" not in text else text
        )  # Python's 0_3 is not a number here
    except ValueError:
        value = text
    try:
        return quantity.check(value, quantity.option)
    except ValueError as error:
        raise InputError(str(error)) from None


def _printable(name: str) -> str:
    """The file's name in characters that the output can hold."""
    encoding = getattr(sys.stdout, "encoding", None) or "ascii"
    return name.encode(encoding, "backslashreplace").decode(encoding)


def _study(name: str) -> Study:
    return _checked(load_study, name, STUDY_BYTES)


def _checked(load: Callable[[bytes], Any], name: str, limit: int) -> Any:
    if not name:  # an unset variable of a shell, which Path would take for this folder
        raise InputError("FILE must be the name of a file, not ''")
    try:
        with Path(name).open("rb") as file:
            size = os.fstat(file.fileno()).st_size
            content = file.read(limit + 1)
    except OSError as error:
        raise InputError(f"{name} must be a readable file: {error.strerror}") from None
    if size > limit:
        raise InputError(f"{name} must be at most {limit:,} bytes, not {size:,}")
    try:
        return load(content)
    except ValueError as error:
        raise InputError(f"{name}: {error}") from None


if __name__ == "__main__":
    sys.exit(main())
