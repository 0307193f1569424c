"""Re-make the validation page: ``.venv/bin/python -m tests.remake_validation``; needs no ngspice.

``reports/validation/index.html`` and ``checks.csv``. With ``--simulate`` the stored simulations of the open cards and
of the same equations are made anew first (ngspice, about a minute).
"""

from __future__ import annotations

import sys


def main() -> None:
    from tests.validation import from_open_cards, from_solvers, simulated
    from tests.validation.dossier import collect, write

    if "--simulate" in sys.argv[1:]:
        simulated.measure(from_open_cards.run_all)
        from_solvers.measure()
    found = collect()
    write(found)
    failed = [check for check in found.checks if not check.holds]
    sys.stdout.write(f"{len(found.checks)} checks, {len(failed)} fail; not reached: {len(found.unreached)} functions\n")


if __name__ == "__main__":
    main()
