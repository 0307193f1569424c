"""Text of a new study, written from the sets that ship and from what a study may say (layer 10)."""

from __future__ import annotations

from typing import get_args

from benchmark.catalogue import EVIDENCE, PRODUCT_CLASSES, QUANTITIES
from benchmark.circuits.library import BUILT_IN
from benchmark.circuits.rules import RULES
from benchmark.cli.template_numbers import SPREADS, STUDY_NUMBERS
from benchmark.cli.templates import comment, value_block
from benchmark.errors import UsageError
from benchmark.record.load import load_technology, open_library
from benchmark.sets.parameters import ParameterSet
from benchmark.sets.study import REQUIREMENTS
from benchmark.sets.study_schema import METRICS, POLICIES
from benchmark.units import from_si, parse_unit

__all__ = ["CANDIDATE", "CONTENDERS", "study_template"]

#: shipped sets a new study starts from
CANDIDATE = "demo-stress-gated"
CONTENDERS = ("open-7nm-regular", "open-7nm-low-leakage")
CIRCUIT = "random-logic"
PRODUCT = "always-on hub"
TEMPERATURES = ("0.0", "25.0", "85.0")
OWNER = "example team (fictional)"


def _wires(reference: ParameterSet) -> ParameterSet:
    """The shipped wires set of the reference's node, or the first one."""
    library = open_library()
    sets = [load_technology(name) for name in library.ids("wires")]
    if not sets:
        message = "no wires set is shipped, so no study can be written"
        raise UsageError(message)
    return next((item for item in sets if reference.nodes[0] in item.nodes), sets[0])


def _supply(item: ParameterSet) -> tuple[float, float]:
    """Supply range to search: where the set is valid, else its declared supply alone."""
    if "supply" in item.valid:
        return item.valid["supply"]
    declared = float(item.values["declared_supply"].si[0])
    return declared, declared


def _side(kind: str, item: ParameterSet) -> str:
    header = f"[{kind}]" if kind == "candidate" else f"[[{kind}]]"
    low, high = _supply(item)
    lines = [header, f'technology = "{item.id}"']
    if kind == "contender":
        lines.append('# id = "a name of its own"          # when one technology appears twice')
    lines += [
        f"[{kind}.knobs]",
        f'supply = {{ low = {low:g}, high = {high:g}, unit = "V" }}',
        "# size = { values = [1, 2] }         # units of width or copies, frozen in silicon",
        "# copies = { values = [1, 2, 4] }    # parallel copies, where operations do not depend on each other",
        f"[{kind}.overhead]                # a ledger: a zero is an entry, not an omission",
    ]
    for name in ("level_shifter_energy", "supply_efficiency", "overhead_power"):
        lines.append(f'{name} = {{ value = {STUDY_NUMBERS[name]}, unit = "{QUANTITIES[name].unit}" }}')
    lines.append(f'# with workload.idle = "gated":\n# [{kind}.gating]')
    for name in ("residual_leakage", "wake_energy_cycles"):
        lines.append(f'# {name} = {{ value = {STUDY_NUMBERS[name]}, unit = "{QUANTITIES[name].unit}" }}')
    lines.append(f"# with the knob copies:\n# [{kind}.mitigation]")
    for name in ("routing_overhead", "repeated_share", "area_share"):
        lines.append(f'# {name} = {{ value = {STUDY_NUMBERS[name]}, unit = "{QUANTITIES[name].unit}" }}')
    return "\n".join(lines)


def _temperatures(sets: list[ParameterSet]) -> str:
    kelvin = parse_unit("degC")
    fits = [
        text
        for text in TEMPERATURES
        if all(
            from_si(item.valid["temperature"][0], kelvin)
            <= float(text)
            <= from_si(item.valid["temperature"][1], kelvin)
            for item in sets
            if "temperature" in item.valid
        )
    ]
    return ", ".join(fits)


def _values() -> list[str]:
    which = BUILT_IN[CIRCUIT]
    names = ["clock_frequency", *which.required, "average_net_pitches", "busiest_activity", "duty"]
    return [
        value_block(QUANTITIES[name], STUDY_NUMBERS[name], spread=SPREADS.get(name, ""))
        for name in dict.fromkeys(names)
    ]


_LIMITS: dict[str, tuple[str, ...]] = {
    "deadline": ('limit = "cycle"                     # or { value, unit }', 'kind = "hard"'),
    "noise_margin": ('limit = { value = 0.10, unit = "1" }', "fan_in = 2", 'kind = "hard"'),
    "voltage_gain": ('limit = { value = 2.0, unit = "1" }', "fan_in = 1", 'kind = "hard"'),
    "thermal_noise": ('limit = { value = 12.0, unit = "1" }', 'kind = "hard"'),
    "hysteresis_window": ('limit = { value = 0.5, unit = "1" }', 'kind = "hard"'),
    "device_limits": ('limit = { value = 1.0, unit = "1" }', 'kind = "hard"'),
    "power_density": ('limit = { value = 10.0, unit = "W/cm^2" }', 'kind = "hard"'),
    "endurance": ('life = { value = 10.0, unit = "year" }', 'kind = "report"'),
    "process_temperature": ('limit = { value = 400.0, unit = "degC" }', 'kind = "report"'),
    "area": ('limit = { value = 10.0, unit = "1" }', 'kind = "report"'),
}
#: judged only when a set states them, or rarely asked: commented out
_SPARE: dict[str, tuple[str, ...]] = {
    "retention": ('limit = { value = 1.0, unit = "s" }', 'kind = "report"'),
    "leakage_power": ('limit = { value = 1.0, unit = "uW" }', 'kind = "report"'),
}


def _requirements() -> list[str]:
    blocks = []
    for name, (_, meaning) in REQUIREMENTS.items():
        lines = [f"[requirements.{name}]", *(_LIMITS.get(name) or _SPARE.get(name, ('kind = "report"',)))]
        if name not in _LIMITS:
            lines = [f"# {line}" for line in lines]
        blocks.append("\n".join([comment(meaning[0].upper() + meaning[1:]), *lines]))
    return blocks


def study_template(stem: str) -> str:
    """Return the text of a study that runs as written."""
    candidate = load_technology(CANDIDATE)
    contenders = [load_technology(name) for name in CONTENDERS]
    wires = _wires(contenders[0])
    which = BUILT_IN[CIRCUIT]
    policies = ", ".join(get_args(POLICIES))
    supports = ", ".join(name for name, item in EVIDENCE.items() if item.support == "go")
    parts = [
        "\n".join(
            [
                comment(
                    "Study written by evenload new. It runs as it stands; every number is invented: put in yours. "
                    "Fix the criteria (policy, metric, required advantage) before you look at results."
                ),
                "schema = 1",
                f'id = "{stem}"',
                'title = "Is the invented switch worth it?"',
                "declared = 2026-01-31               # the day the criteria were fixed",
                f'owner = "{OWNER}"',
                "demonstration = true                # some inputs are invented; without invented inputs: false",
                'note = ""',
            ]
        ),
        comment(
            'What a value below does not say itself. A decision of your own is evidence = "choice" with its owner and '
            f'source = "team-choice". Classes that may carry a go: {supports}'
        )
        + f'\n[default]\nevidence = "invented"\nsource = "invented"\nowner = "{OWNER}"\nconditions = "-"\nwhere = "-"',
        comment(f"K, the product class: {', '.join(PRODUCT_CLASSES)}")
        + f'\n[product]\nclass = "{PRODUCT}"\ndescribe = "Placeholder for the block in question"',
        "\n".join(
            [
                comment(f"W, the workload. Built-in circuits: {', '.join(BUILT_IN)}; or the id of a circuit file"),
                "[workload]",
                f'operation = "{which.operation}"',
                f'circuit = "{CIRCUIT}"',
                '# topology = "own-best"             # a side may then name a circuit = "..." of the same function',
                'timing = "clocked"                  # clocked: one operation per clock cycle | self-timed',
                'leakage_accounting = "period"       # period: over the clock cycle | operation: over the path delay',
                'idle = "none"                       # none | ungated | gated (with idle_time and active_cycles)',
            ]
        ),
        *_values(),
        "\n".join(
            [
                "# What both sides share",
                "[conditions]",
                f'temperatures = {{ values = [{_temperatures([candidate, *contenders])}], unit = "degC" }}',
                f'delay_rule = "chain"                # {" | ".join(RULES)}: how R C becomes a delay',
                'short_circuit = "estimated"         # estimated | none',
                f'wires = "{wires.id}"',
                "guard_band = { delay = 1.0, leakage = 1.0 }   # multipliers for both sides; 1 means none",
            ]
        ),
        comment("The candidate, and one [[contender]] for every rival; the strongest one is the reference")
        + "\n"
        + _side("candidate", candidate),
        *(_side("contender", item) for item in contenders),
        "\n".join(
            [
                "# Which label stands against which; the headline pair carries the verdict",
                "[nodes]",
                f'headline = "{candidate.nodes[0]}"',
                "pairs = [",
                *(
                    f'  {{ label = "{node}", candidate = "{node}", reference = "{contenders[0].nodes[0]}", '
                    f'wires = "{wires.nodes[0]}" }},'
                    for node in candidate.nodes
                ),
                "]",
            ]
        ),
        comment("Q, the requirements. Hard ones bound the search of both sides; report ones are judged at the optimum")
        + "\n"
        + _requirements()[0],
        *_requirements()[1:],
        "\n".join(
            [
                comment(f"P and X. Policies: {policies}. Metrics: {', '.join(get_args(METRICS))}"),
                "[policy]",
                'primary = "minimum-energy"',
                'also = ["declared-point", "iso-delay"]',
                'required_time = "cycle"             # "cycle", "contender:<id>" or { value, unit }',
                'metric = "energy-per-operation"',
            ]
        ),
        "# M: advantage = reference / candidate; what a new process step must bring to be worth it\n"
        "[verdict]\nrequired_advantage = 2.0",
        "# Draws of all stated ranges together: 0 for none, else a power of two from 16. From which probability of\n"
        "# reaching M on it is called likely, and up to which unlikely\n"
        "[uncertainty]\ndraws = 256\nlikely = 0.9\nunlikely = 0.1",
        "# Points of the supply grid, then refined to this relative step\n"
        "[search]\nsupply_points = 61\nrefine_relative = 1.0e-6",
    ]
    return "\n\n".join(parts) + "\n"
