"""The validation page: one file, no request, no script; look and building blocks of the reports."""

from __future__ import annotations

import platform
from collections import Counter
from collections.abc import Iterable, Sequence
from importlib.metadata import version
from importlib.resources import files
from statistics import median

import jinja2

from benchmark.report.blocks import Block, Bullets, Cell, Notice, Paragraph, Section, Table, plain
from benchmark.report.words import number, plural, visible
from tests.validation import figures
from tests.validation.check import KINDS, Check
from tests.validation.dossier import Dossier
from tests.validation.from_anchors import results
from tests.validation.from_published import unanswered
from tests.validation.reach import PACKAGES

__all__ = ["page", "sections"]

TITLE = "Evenload: what its numbers were compared with"
#: checks nearest to what they allow that are listed by name
NEAREST = 20
_FRAME = """\
<!DOCTYPE html>
<html lang="en">
<head>
<meta charset="utf-8">
<meta http-equiv="Content-Security-Policy" content="default-src 'none'; style-src 'unsafe-inline'; base-uri 'none'; \
form-action 'none'">
<meta name="viewport" content="width=device-width, initial-scale=1">
<meta name="referrer" content="no-referrer">
<meta name="color-scheme" content="light">
<title>{{ title }}</title>
<style>
{{ css|safe }}</style>
</head>
<body>
<a class="skip" href="#{{ sections[0].key }}">Skip to the counts</a>
<header>
<h1>{{ title }}</h1>
</header>
<main>
{% include "sections.html" %}
</main>
</body>
</html>
"""


def _percent(relative: float) -> str:
    return f"{number(100.0 * relative)} %" if abs(relative) >= 5e-6 else "under 0.001 %"


def _used(check: Check) -> float:
    """Share of the tolerance that is used [1]; an exact agreement uses none."""
    difference = abs(check.obtained - check.expected)
    return 0.0 if difference == 0.0 else difference / check.allowed if check.allowed > 0.0 else float("inf")


def _largest(checks: Sequence[Check]) -> Check:
    return max(checks, key=lambda one: abs(one.residual) if one.expected else 0.0)


def _summary_row(name: Cell, checks: Sequence[Check]) -> list[object]:
    worst = _largest(checks)
    return [
        name,
        len(checks),
        sum(not one.holds for one in checks),
        Cell(_percent(median(abs(one.residual) for one in checks)), number=True),
        Cell(_percent(worst.residual), number=True),
        worst.name,
    ]


def _counts(found: Dossier) -> Section:
    main = [one for one in found.checks if not one.isolates]
    failing = [one for one in found.checks if not one.holds]
    rows = []
    for kind, meaning in KINDS.items():
        mine = [one for one in main if one.kind == kind]
        if mine:
            rows.append(_summary_row(Cell(kind, small=meaning), mine))
    known = Counter(one.word for one in main)
    word = {
        "seen": "read at its source",
        "seen in part": "part of it read at its source",
        "second-hand": "read in a restatement by others",
        "from memory": "known from memory, recomputed",
        "derived": "derived and worked out for the comparison",
        "own simulation": "simulated here with a named simulator and cards",
    }
    reached = sum(found.functions.values())
    blocks: list[Block] = [
        Paragraph(
            f"{plural(len(main), 'comparison')} with numbers that this program did not make, and "
            f"{plural(len(found.checks) - len(main), 'second measurement')} that say where differences come from; "
            f"{len(failing) or 'none'} of them outside what is allowed. {reached} of {len(found.functions)} public "
            "functions that compute numbers were reached by one."
        ),
        plain(
            "by-kind",
            "Comparisons by kind",
            ("kind", "count", "fail", "median difference", "largest difference", "where"),
            rows,
            wide=True,
        ),
        plain(
            "by-knowledge",
            "How the expected numbers are known",
            ("known", "meaning", "count"),
            [(name, text, known[name]) for name, text in word.items() if known[name]],
        ),
        plain(
            "files",
            "Tables beside this page",
            ("file", "holds"),
            [
                (
                    Cell("checks.csv", "checks.csv"),
                    "every comparison: source, status, expected and obtained number, difference, tolerance",
                ),
                (Cell("functions.csv", "functions.csv"), "every public function that computes numbers: reached or not"),
            ],
        ),
    ]
    if failing:
        blocks.insert(1, Notice(f"{plural(len(failing), 'comparison')} outside what is allowed.", "Failing."))
    return Section("counts", "What was compared", tuple(blocks))


def _table(key: str, caption: str, checks: Iterable[Check]) -> Table:
    rows = [
        (
            Cell(one.name, small=one.group),
            Cell(number(one.expected, 5), number=True),
            Cell(number(one.obtained, 5), number=True),
            Cell(_percent(one.residual) if one.expected else number(one.residual), number=True),
            Cell(number(one.allowed, 2), small=one.basis),
            Cell(one.word, small=one.source),
        )
        for one in checks
    ]
    columns = ("comparison", "expected", "obtained", "difference", "allowed", "source")
    return plain(key, caption, columns, rows, wide=True)


def _failing(found: Dossier) -> Section:
    failing = [one for one in found.checks if not one.holds]
    # a band was made of its points, so some of them always lie at its ends
    free = [one for one in found.checks if one.holds and one.kind != "simulator, charges of the device"]
    nearest = sorted(free, key=_used, reverse=True)[:NEAREST]
    return Section(
        "failing",
        "What fails, and what nearly does",
        (
            _table("failing-table", "Outside what is allowed", failing),
            _table("nearest-table", f"The {len(nearest)} comparisons that use most of what is allowed", nearest),
        ),
    )


def _groups(found: Dossier) -> Section:
    blocks: list[Block] = [
        Paragraph(
            "Tolerances are half a unit of the last printed digit for published numbers, or the stated error of the "
            "model. Second measurements that explain a difference count as no result of their own and are left out."
        )
    ]
    for position, kind in enumerate(KINDS):
        mine = [one for one in found.checks if one.kind == kind and not one.isolates]
        groups = dict.fromkeys(one.group for one in mine)
        rows = [_summary_row(Cell(group), [one for one in mine if one.group == group]) for group in groups]
        if rows:
            columns = ("group", "count", "fail", "median difference", "largest difference", "where")
            blocks.append(plain(f"groups-{position}", kind.capitalize(), columns, rows, wide=True))
    return Section("groups", "Comparisons by group", tuple(blocks))


def _published(found: Dossier) -> Section:
    cases = [one for one in found.checks if one.kind == "published case"]
    return Section(
        "published", "Published cases", (_table("published-table", "Numbers as printed by their sources", cases),)
    )


def _bands() -> Section:
    text = (
        "ngspice solves each stage with the charges of the device; the closed forms know constants. A report states "
        "the band at its own points, and says so where none was measured."
    )
    return Section("bands", "Error bands of the closed forms", (Paragraph(text), *figures.blocks()))


def _anchors() -> Section:
    rows = []
    solved: Counter[str] = Counter()
    without = []
    for name, anchors in results():
        solved[name] = sum(one.fitted for one in anchors)
        free = [one for one in anchors if not one.fitted]
        if not free:
            without.append(name)
        rows += [
            (
                Cell(name, small=one.node),
                one.name.replace("_", " "),
                Cell(f"{number(one.supply, 3)} V", number=True),
                Cell(number(one.published, 4), number=True),
                Cell(number(one.predicted, 4), number=True),
                Cell(_percent(one.difference), number=True),
                Cell(one.source, small=one.where),
            )
            for one in free
        ]
    columns = ("set", "quantity", "supply", "published [SI]", "by the set", "difference", "source")
    blocks: list[Block] = [
        Paragraph(
            f"Values a set was solved for ({sum(solved.values())} of all sets) are met to the precision of the solver "
            "and say nothing about the model; they are left out."
        ),
        plain("anchors-table", "Values that were not fitted", columns, rows, wide=True),
    ]
    if without:
        blocks.append(
            Notice("Nothing outside their inputs supports these sets: " + ", ".join(without) + ".", "Sets without any.")
        )
    return Section("anchors", "Anchors of the reference sets", tuple(blocks))


def _functions(found: Dossier) -> Section:
    rows = []
    for package in PACKAGES:
        mine = {name: on for name, on in found.functions.items() if name.partition(":")[0].split(".")[0] == package}
        rows.append((package, len(mine), sum(mine.values()), sum(not on for on in mine.values())))
    blocks: list[Block] = [
        Paragraph(
            "Public functions whose result holds numbers. Reached: entered while a comparison obtained its number, as "
            "measured by the interpreter; so an error there can show, which is less than that it must. A test spoils "
            "each function named by a published row by 7 % and asks that a row notices."
        ),
        plain("functions-table", "Functions reached, by package", ("package", "functions", "reached", "not"), rows),
    ]
    if found.unreached:
        blocks.append(Bullets(tuple(found.unreached), "Not reached by any comparison with the outside:"))
    else:
        blocks.append(Paragraph("Every one was reached."))
    return Section("functions", "Functions without an outside check", tuple(blocks))


def _unanswered() -> Section:
    by_reason: dict[str, list[str]] = {}
    for row, why in unanswered():
        by_reason.setdefault(why, []).append(row["row_id"].partition(".")[2])
    rows = [(why, len(names), ", ".join(names)) for why, names in by_reason.items()]
    count = sum(len(names) for names in by_reason.values())
    text = f"{count} collected rows are about laws that are no part of the program."
    table = plain("unanswered-table", "Rows that nothing answers", ("reason", "count", "rows"), rows, wide=True)
    return Section("unanswered", "Collected rows that are not used", (Paragraph(text), table))


def _made() -> Section:
    names = ("evenload", "numpy", "scipy", "mpmath")
    return Section(
        "made",
        "How this page is made",
        (
            Bullets(
                (
                    "By .venv/bin/python -m tests.remake_validation; a test re-makes it and compares every number with "
                    "the files here.",
                    "Numbers that need ngspice come from files in tests/data (closed-form-*.csv, "
                    "simulated-open-cards.csv); other tests simulate lines of them again.",
                    "Differences are relative to the expected number, plain where that is 0.",
                    "Sources of single rows are named in checks.csv, as is what each number is: read, from memory, "
                    "derived, simulated.",
                )
            ),
            Paragraph(
                f"Python {platform.python_version()}, "
                + ", ".join(f"{name} {version(name)}" for name in names)
                + "; stored simulations: ngspice 39.3.",
                "Software.",
            ),
        ),
    )


def sections(found: Dossier) -> list[Section]:
    """Return every section."""
    return [
        _counts(found),
        _failing(found),
        _groups(found),
        _published(found),
        _bands(),
        _anchors(),
        _functions(found),
        _unanswered(),
        _made(),
    ]


def _text(name: str) -> str:
    if name == "page.html":
        return _FRAME
    return files("benchmark.report").joinpath("templates", name).read_text(encoding="utf-8")


def page(found: Dossier) -> str:
    """Return the whole page."""
    environment = jinja2.Environment(
        loader=jinja2.FunctionLoader(_text),
        autoescape=True,
        undefined=jinja2.StrictUndefined,
        finalize=lambda value: visible(value) if type(value) is str else value,
        trim_blocks=True,
        lstrip_blocks=True,
    )
    return environment.get_template("page.html").render(
        title=TITLE, sections=sections(found), css=_text("report.css"), plural=plural
    )
