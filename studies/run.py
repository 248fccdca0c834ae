"""Run a study: python studies/run.py NAME

Reads studies/NAME/model.toml, does its analyses, and leaves the results file and the plots listed in
studies/NAME/plots.toml in studies/NAME/results/. A row of that list names the analysis, the plot, the
file to write, and what the plot is to show:

    [[plots]]
    analysis = "lantern dropped"
    plot = "history"
    file = "drop.png"
    choices = { joint = "C" }
"""

from __future__ import annotations

import sys
import tomllib
from pathlib import Path

import tautbar
from tautbar.progress import Progress

STUDIES = Path(__file__).parent


def main(arguments: list[str]) -> int:
    """Run the study named; 0 if each of its analyses is complete, 3 if not, 2 if there is no such study."""
    names = sorted(model.parent.name for model in STUDIES.glob("*/model.toml"))
    if len(arguments) != 1 or arguments[0] not in names:
        print(f"Name one study: {', '.join(names)}", file=sys.stderr)
        return 2
    try:
        return run_study(STUDIES / arguments[0])
    except tautbar.TautbarError as error:
        print(error, file=sys.stderr)
        return error.exit_code


def run_study(folder: Path) -> int:
    """Do the analyses and draw the plots of the study in a folder."""
    place = folder / "results"
    place.mkdir(exist_ok=True)
    model = tautbar.read_model(folder / "model.toml")
    with tautbar.run(
        model, place / f"{folder.name}.h5", overwrite=True, progress=Progress(), on_record=show
    ) as results:
        for row in tomllib.loads((folder / "plots.toml").read_text("utf-8"))["plots"]:
            figure = tautbar.plot(results[row["analysis"]], row["plot"], **row.get("choices", {}))
            tautbar.save_plot(figure, place / row["file"])
            print(place / row["file"])
        print(results.path)
        return 0 if all(result.status == "complete" for result in results.values()) else 3


def show(record: object) -> None:
    """Print the answer and the audit of an analysis."""
    print(tautbar.answer_text(record), end="\n\n")


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
