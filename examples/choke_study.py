"""Which choke and which rectifier for the radio supply of a narrowboat (invented): a sweep from Python.

Run it as ``python examples/choke_study.py``. Processes are started under ``__main__`` only, as Python wants it.
"""

from pathlib import Path

import buckdesign

STUDY = Path(__file__).with_name("radio_choke.study.toml")


def main() -> None:
    """Compute the study and show what a maker would ask."""
    table = buckdesign.sweep(STUDY)
    good = table[table["within_limits"]]
    print(f"{len(table)} points, {len(good)} of them within all limits")

    # a choice is good only if it is good on the flat bank in the cold and on charge in the heat
    choice = ["choke.turns", "network.rh", "output_capacitor.esr", "rectifier.part"]
    corners = table.groupby(choice).agg(
        worst_loss_w=("total_loss_w", "max"),
        worst_ripple_v=("ripple_v", "max"),
        always_within_limits=("within_limits", "all"),
    )
    keeping = corners[corners["always_within_limits"]].sort_values("worst_loss_w")
    print("least loss of those that keep every limit in both corners:")
    print(keeping.head(5)[["worst_loss_w", "worst_ripple_v"]].to_string())

    for part, rows in table.groupby("rectifier.part"):
        print(f"{part}: {rows['total_loss_w'].median():.2f} W in the middle of all")


if __name__ == "__main__":
    main()
