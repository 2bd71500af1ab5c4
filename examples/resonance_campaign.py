"""A small campaign, from kinematics to figure and report: five gluons through the first string resonances.

The question is invented, the way is not: two gluons collide and make three, at one shape of the event and growing
energy.  Where the energy meets a multiple of the string scale the colour-ordered amplitude has a resonance.  How high
are the peaks, how well is every number known, and does the first one agree with the residue at the pole?

    python examples/resonance_campaign.py              a reduced size, some seconds
    python examples/resonance_campaign.py --full       the recorded size
    python examples/resonance_campaign.py --out FOLDER where the store, figures and the report go
"""

from __future__ import annotations

import argparse
import tempfile
from fractions import Fraction
from pathlib import Path

import kn_integrate as kn

# The shape of the event at alpha' s = 1: legs 1 and 2 come in, 3, 4 and 5 go out.  X = -alpha' (invariant mass)^2, so
# channels of outgoing legs are negative, and those with one incoming leg positive.
SHAPE = {(1, 2): "-1", (2, 3): "3/10", (3, 4): "-2/5", (4, 5): "-1/4", (1, 5): "1/5"}
WIDTH = Fraction(1, 25)  # i epsilon, in place of the widths of the resonances
GLUONS = "PT(1,2,3,4,5)"


def show_event(kin: kn.Mandelstams) -> None:
    print("1. The event")
    for i, j in ((1, 2), (3, 4), (3, 5), (4, 5), (1, 3), (2, 3)):
        print(f"   s_{i}{j} = {kin.pair(i, j)}")
    assert all(kin.pair(i, j) < 0 for i, j in ((1, 2), (3, 4), (3, 5), (4, 5))), "outgoing pairs are timelike"
    assert all(kin.pair(i, j) > 0 for i in (1, 2) for j in (3, 4, 5)), "momentum transfers are spacelike"


def show_poles(kin: kn.Mandelstams, folder: Path) -> None:
    print("\n2. Poles around it, with the other channels held")
    found = kn.pole_map(kin, GLUONS, ((1, 2), -3, 1), ((3, 4), -2, 1))
    found.draw(folder / "poles.png")
    for line in found.lines:
        x, y = (f"{float(line.start[k]):+.2f}..{float(line.stop[k]):+.2f}" for k in (0, 1))
        print(f"   channel {''.join(map(str, line.channel))} level {line.level}: X_12 {x}, X_34 {y}")


def energies(kin: kn.Mandelstams, count: int) -> kn.ScanPoints:
    """Massless kinematics scale with the energy; the i epsilon does not."""
    line = kn.ScanPoints.line(kin.scaled("1/5"), kin.scaled("16/5"), count)
    return line.map(lambda point: kn.plus_i_epsilon(point, WIDTH))


def run_scan(kin: kn.Mandelstams, count: int, folder: Path) -> kn.Scan:
    print("\n3. The scan")
    store = folder / "energies.sqlite"
    points = energies(kin, count)
    first = kn.ScanPoints(points.points[: count // 3])
    scan = kn.scan(first, GLUONS, store=store, progress="none")
    print(f"   a first look: {len(scan)} of {len(points)} points")
    scan = kn.scan(points, GLUONS, store=store, progress="none")  # goes on with what is missing
    print(f"   all: {len(scan)} of {scan.total} points, {scan.counts}")
    scan.to_csv(folder / "energies.csv")
    worst = max(row.error / abs(row.value) for row in scan)
    print(f"   largest claimed relative error below 1e-10: {worst < 1e-10}")
    return scan


def check_a_point(scan: kn.Scan) -> dict[str, kn.Estimate]:
    print("\n4. Trust: the same point by the two engines, which share nothing but definitions")
    row = max(scan, key=lambda row: abs(row.value))
    results = {method: kn.disk_integral(row.place, GLUONS, method=method) for method in ("quadrature", "kz")}
    for method, result in results.items():
        print(f"   {method:<10} {result.value:.9f}")
    apart = abs(results["quadrature"].value - results["kz"].value)
    claimed = sum(result.error for result in results.values())
    print(f"   apart by less than the claimed errors: {apart <= claimed} (agreement is evidence, not proof)")
    return results


def compare_with_residue(kin: kn.Mandelstams) -> float:
    print("\n5. The first resonance against its residue")
    # At energy 1 the channel 12 is on its pole of level 1.  Beside it the amplitude is residue / (X_12 + 1) and a
    # regular rest, of which the mean over both sides leaves a term of second order in the distance.
    residue = kn.residue(kin, GLUONS, channel=(1, 2), level=1)
    print(f"   residue {residue.value:.9f}")
    planar = kin.planar()
    ratios = []
    for step in (Fraction(1, 100), Fraction(1, 1000)):
        sides = []
        for sign in (1, -1):
            beside = kn.Mandelstams.from_planar(5, {**planar, (1, 2): -1 + sign * step})
            sides.append(sign * float(step) * kn.disk_integral(beside, GLUONS).value)
        ratios.append(sum(sides) / 2 / float(residue.value))
        print(f"   X_12 = -1 +- {step}: (amplitude x distance) / residue = {ratios[-1]:.8f}")
    return ratios[-1]


def write_report(scan: kn.Scan, results: dict[str, kn.Estimate], folder: Path) -> None:
    print("\n6. Figures and report")
    line = kn.energy_line(scan, (1, 2), channels=[(1, 2), (3, 4), (4, 5)])
    line.draw(folder / "amplitude.png")
    kn.error_budget(results, sensitivity=False).draw(folder / "errors.png")
    for r in line.resonances:
        print(f"   passes channel {''.join(map(str, r.channel))} level {r.level} at X_12 = {r.x:.4f}")
    table = kn.latex_table(
        {f"by {method}": result for method, result in results.items()},
        caption="The colour-ordered five-gluon integral at its highest point on the line.",
        label="tab:peak",
    )
    text = [
        r"\documentclass{article}",
        r"\usepackage{graphicx}",
        r"\begin{document}",
        r"\section*{Five gluons through the first string resonances}",
        rf"{len(scan)} energies; every value within $10^{{-10}}$ of its modulus.",
        r"\begin{center}\includegraphics[width=0.8\textwidth]{amplitude.png}\end{center}",
        table,
        r"\nocite{*}\bibliographystyle{unsrt}\bibliography{methods}",
        r"\end{document}",
    ]
    (folder / "report.tex").write_text("\n".join(text) + "\n", encoding="utf-8")
    entries = {e.split(",")[0]: e for result in results.values() for e in result.bibtex().split("\n\n")}
    (folder / "methods.bib").write_text("\n\n".join(entries.values()), encoding="utf-8")
    print("   " + ", ".join(sorted(path.name for path in folder.iterdir())))


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--full", action="store_true", help="the recorded size: 301 energies in place of 31")
    parser.add_argument("--out", type=Path, help="folder for the results [a temporary one]")
    options = parser.parse_args()
    with tempfile.TemporaryDirectory() as temporary:
        folder = Path(temporary) if options.out is None else options.out
        folder.mkdir(parents=True, exist_ok=True)
        kin = kn.Mandelstams.from_planar(5, SHAPE)
        show_event(kin)
        show_poles(kin, folder)
        scan = run_scan(kin, 301 if options.full else 31, folder)
        results = check_a_point(scan)
        ratio = compare_with_residue(kin)
        write_report(scan, results, folder)
        assert scan.ok
        assert abs(results["quadrature"].value - results["kz"].value) <= sum(r.error for r in results.values())
        assert abs(ratio - 1) < 1e-4, "the amplitude beside the pole is the residue over the distance"


if __name__ == "__main__":
    main()
