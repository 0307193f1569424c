"""Every step of one design point as arithmetic, and the program's own result beside it (layer 10).

The formulas are those of ``benchmark.circuits.stage``, ``operation`` and ``benchmark.evaluate.points``, put together
again from the switch record and the circuit. The last lines compare; a difference would be a fault of the program.
"""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np

from benchmark.circuits.circuit import Net
from benchmark.circuits.operation import OperationMetrics, estimate
from benchmark.circuits.stage import short_circuit_currents
from benchmark.cli.arithmetic import Sheet, shown
from benchmark.cli.trace_net import NetArithmetic, edges_of, one
from benchmark.decide.limiting import limiting
from benchmark.devices.record import SwitchPair
from benchmark.evaluate.points import Points, design_points
from benchmark.evaluate.side import SideProblem
from benchmark.record.text import engineering
from benchmark.sets.study import Choice

__all__ = ["AGREEMENT", "trace_point"]

#: largest relative difference between this arithmetic and the program's own result
AGREEMENT = 1.0e-9
#: symbol -> (field of the record, unit, meaning)
_FIELDS: dict[str, tuple[str, str, str]] = {
    "R": ("resistance", "ohm", "closed switch, 50 % step delay = ln 2 R C"),
    "w": ("switching_level", "1", "input level, of the supply, where R is doubled"),
    "I_on": ("on_current", "A", "on-state current"),
    "I_off": ("off_current_path", "A", "leakage through the open path"),
    "I_in_high": ("off_current_input_high", "A", "leakage through the input at the closing level"),
    "I_in_low": ("off_current_input_low", "A", "leakage through the input at the opening level"),
    "I_body": ("off_current_body", "A", "leakage into the body"),
    "Q_in": ("input_charge", "C", "input charge over the full swing (energy)"),
    "C_in": ("input_capacitance_delay", "F", "input capacitance in the switching window (delay)"),
    "C_t": ("terminal_capacitance", "F", "one conducting terminal (energy)"),
    "C_td": ("terminal_capacitance_delay", "F", "one conducting terminal (delay)"),
    "E_x": ("extra_energy", "J", "loss per input cycle beyond charge times supply"),
    "t_on": ("closing_time", "s", "time to close, load-independent"),
    "t_off": ("opening_time", "s", "time to open, load-independent"),
    "A": ("area", "m^2", "area of one switch"),
    "P_bias": ("bias_power", "W", "standing power of the bias"),
}


def trace_point(
    problem: SideProblem, supply: float, size: float, shift: float, copies: float = 1.0, back_bias: float = 0.0
) -> list[str]:
    """Return the lines of one design point."""
    return _Tracer(problem, supply, Choice(size, shift, copies, back_bias)).lines()


class _Tracer:
    def __init__(self, problem: SideProblem, supply: float, choice: Choice) -> None:
        size, self.choice = choice.size, choice
        self.problem, self.study, self.size = problem, problem.study, size
        self.points: Points = design_points(problem, np.array([[supply]]), *choice)
        shift = float(np.ravel(problem.device_shift(choice.threshold_shift, choice.back_bias))[0])
        temperatures = self.study.temperatures
        self.slow = temperatures[int(self.points.slowest_temperature[0, 0])]
        self.hot = temperatures[-1]
        self.pairs = {kelvin: self._switches(supply, shift, kelvin) for kelvin in (self.slow, self.hot)}
        self.copies = problem.side.technology.options.get("size_scaling") == "copies"
        self.circuit = problem.circuit_at(np.array([[supply]]), size, shift)
        self.sheet = Sheet()
        self.net = NetArithmetic(self.sheet, problem, self.circuit, size, self.copies)
        self.supply = supply
        self._estimates: dict[float, OperationMetrics] = {}

    def _switches(self, supply: float, shift: float, kelvin: float) -> SwitchPair:
        cube = (1, 1, 1)
        knobs = {"threshold_shift": np.full(cube, shift)}
        return self.problem.device.switch(self.problem.prepared, np.full(cube, supply), np.full(cube, kelvin), knobs)

    def _metrics(self, kelvin: float) -> OperationMetrics:
        if kelvin not in self._estimates:
            self._estimates[kelvin] = self._estimate(kelvin)
        return self._estimates[kelvin]

    def _estimate(self, kelvin: float) -> OperationMetrics:
        return estimate(
            self.circuit,
            self.pairs[kelvin],
            self.problem.wires,
            self.study.delay_rule,
            size=self.size,
            size_as="copies" if self.copies else "width",
            guard_delay=self.study.guard_band_delay,
            guard_leakage=self.study.guard_band_leakage,
            short_circuit=self.study.short_circuit == "estimated",
        )

    def lines(self) -> list[str]:
        """Go through the point once."""
        sheet = self.sheet
        sheet.text(
            "Numbers are SI with six digits; every line can be recombined by hand. * is times, ** is to the power."
        )
        reasons = [reason for reason, mask in self.points.infeasible.items() if mask[0, 0]]
        if reasons:
            sheet.text(f"Not usable here: {'; '.join(reasons)}. The numbers below mean nothing where they exist.")
        sheet.text("")
        sheet.text("Point")
        sheet.given("V", self.supply, "V", "supply voltage")
        sheet.given(
            "size", self.size, "1", "copies of every switch" if self.copies else "units of width of every switch"
        )
        self._choices()
        self._shared()
        nets = self.circuit.nets
        self._areas(nets)
        hot = self.pairs[self.hot]
        title = f"delay at {engineering(self.slow, 'K')}, the slowest of the study"
        if self.hot == self.slow:
            self._device(self.slow, f"{title}, which is the highest as well: energy and leakage")
            for index, net in enumerate(nets, start=1):
                self._net_title(index, net)
                self.net.delay(net, self.pairs[self.slow], self._metrics(self.slow).stages[index - 1], f"t_{index}")
                self.net.energy(net, hot, index)
                self.net.leakage(net, hot, index)
            self._path(nets)
        else:
            self._device(self.slow, title)
            for index, net in enumerate(nets, start=1):
                self._net_title(index, net)
                self.net.delay(net, self.pairs[self.slow], self._metrics(self.slow).stages[index - 1], f"t_{index}")
            self._path(nets)
            self._device(self.hot, f"energy and leakage at {engineering(self.hot, 'K')}, the highest of the study")
            for index, net in enumerate(nets, start=1):
                self._net_title(index, net)
                if self.study.short_circuit == "estimated":
                    self.net.delay(net, hot, self._metrics(self.hot).stages[index - 1], f"t_hot_{index}")
                else:
                    self.net.burden(net)
                self.net.energy(net, hot, index)
                self.net.leakage(net, hot, index)
        self._operation(nets)
        self._compare()
        return sheet.lines

    def _choices(self) -> None:
        """Threshold shift, back bias and parallel copies, where there are any."""
        sheet, costs, choice = self.sheet, self.problem.mitigation, self.choice
        if choice.back_bias:
            sheet.given("V_frozen", choice.threshold_shift, "V", "threshold shift frozen in silicon")
            sheet.given("V_bb", choice.back_bias, "V", "back bias, above 0 forward")
            sheet.given("gamma_b", one(costs["body_factor"]), "1", "threshold shift per volt of back bias")
            sheet.result("V_shift", "V_frozen - gamma_b*V_bb", "V", "threshold shift of the devices")
        elif choice.threshold_shift:
            sheet.given("V_shift", choice.threshold_shift, "V", "threshold shift")
        if choice.copies != 1.0:
            sheet.given("n_copy", choice.copies, "1", "parallel copies, which take turns")
            sheet.given("k_copy", one(costs["routing_overhead"]), "1", "dynamic energy added by each further copy")
            sheet.given("g_copy", one(costs["repeated_share"]), "1", "share of the block each further copy repeats")
            sheet.result("s_copy", "1 + g_copy*(n_copy - 1)", "1", "leakage and wake-up energy against one copy")

    # -- what all nets share ------------------------------------------------------------------------------------

    def _shared(self) -> None:
        wires, sheet = self.problem.wires, self.sheet
        sheet.given("r", one(wires.resistance_per_length), "ohm/m", "wire resistance per length, layer local")
        sheet.given("c", one(wires.capacitance_per_length), "F/m", "wire capacitance per length, layer local")
        sheet.given("C_pin", one(wires.layout_capacitance_per_pin), "F", "layout parasitic per gate input and output")
        sheet.given("g_t", self.study.guard_band_delay, "1", "guard-band of delays")
        sheet.given("g_P", self.study.guard_band_leakage, "1", "guard-band of leakage")

    def _device(self, kelvin: float, title: str) -> None:
        pair, sheet = self.pairs[kelvin], self.sheet
        sheet.text("")
        sheet.text(f"Switch record: {title}")
        edges = edges_of(pair)
        for symbol, (name, unit, meaning) in _FIELDS.items():
            for edge, switch in edges:
                side = "pull-down" if edge == "down" else "pull-up"
                digits = 9 if symbol == "w" else 6  # 1 - w is taken of it
                sheet.given(f"{symbol}_{edge}", one(getattr(switch, name)), unit, f"{side}: {meaning}", digits)
        for edge, switch in edges:
            side = "pull-down" if edge == "down" else "pull-up"
            if edge == "up" and _same(pair):
                sheet.text("  pull-up: intermediate results and limits like the pull-down switch")
                continue
            for name, (value, unit) in switch.intermediates.items():
                sheet.text(f"  {side}, intermediate: {name} = {shown(one(value))} {unit}")
            for limit in switch.limits:
                used, most, margin = (shown(one(x)) for x in (limit.used, limit.limit, limit.margin))
                sheet.text(
                    f"  {side}, {limit.kind} limit: {limit.name} used {used} of {most} {limit.unit}, margin {margin} "
                    f"(value {limit.source})"
                )
        if self.study.short_circuit == "estimated" and kelvin == self.hot:
            for edge, current in short_circuit_currents(pair).items():
                meaning = "average current of the opening switch during the input ramp (integral of its current law)"
                sheet.given(f"J_{edge}", one(current), "A", meaning)

    def _areas(self, nets: tuple[Net, ...]) -> None:
        """Cell areas and the gate pitch, when any wire is measured in it."""
        if all(net.length_unit == "m" for net in nets):
            return
        sheet, pair = self.sheet, self.pairs[self.slow]
        sheet.text("")
        sheet.text("Gate pitch: square root of the mean cell area")
        sheet.given("A_down", one(pair.down.area), "m^2", "area of one pull-down switch")
        sheet.given("A_up", one(pair.up.area), "m^2", "area of one pull-up switch")
        for index, net in enumerate(nets, start=1):
            down, up = sum(net.driver.widths("down", "unit")), sum(net.driver.widths("up", "unit"))
            sheet.given(f"n_{index}", one(net.count), "1", f"cells {net.driver.name} of net {net.name}")
            copies = "" if net.plain else f"*{one(net.copies):g}"
            sheet.result(f"A_{index}", f"n_{index}*(A_down*{down:g} + A_up*{up:g})*size{copies}", "m^2")
        total = " + ".join(f"A_{index}" for index in range(1, len(nets) + 1))
        count = " + ".join(f"n_{index}" for index in range(1, len(nets) + 1))
        sheet.result("pitch", f"(({total})/({count}))**0.5", "m")

    def _net_title(self, index: int, net: Net) -> None:
        loads = ", ".join(f"{one(load.count):g} x {load.cell.name}.{load.input}" for load in net.loads) or "no inputs"
        self.sheet.text("")
        copies = "" if net.plain or one(net.copies) == 1.0 else f"{one(net.copies):g} parallel copies of "
        self.sheet.text(f"Net {index} {net.name!r}: driven by {copies}{net.driver.name}, drives {loads}")

    def _path(self, nets: tuple[Net, ...]) -> None:
        sheet = self.sheet
        sheet.text("")
        sheet.text("Path delay")
        terms = []
        for index, net in enumerate(nets, start=1):
            times = one(net.on_critical_path)
            if times:
                sheet.given(f"k_{index}", times, "1", f"stages like net {index} on the critical path")
                sheet.result(f"T_{index}", f"k_{index}*t_{index}", "s")
                terms.append(f"T_{index}")
        formula = f"g_t*({' + '.join(terms)})"
        shifter = self.problem.overhead.get("level_shifter_delay")
        if shifter is not None:
            sheet.given("t_ls", one(shifter), "s", "level shifters")
            formula += " + t_ls"
        sheet.result("T_path", formula, "s", engineering(one(self.points.time), "s"))

    # -- the operation ------------------------------------------------------------------------------------------

    def _operation(self, nets: tuple[Net, ...]) -> None:
        sheet, problem, study = self.sheet, self.problem, self.study
        sheet.text("")
        sheet.text(f"Operation: {problem.circuit.operation}")
        for index, net in enumerate(nets, start=1):
            sheet.given(f"n_{index}", one(net.count), "1", f"nets like {net.name}")
            sheet.given(f"a_{index}", one(net.rising_per_operation), "1", "rising transitions of one per operation")
            sheet.result(f"dE_{index}", f"n_{index}*a_{index}*E_{index}", "J")
            sheet.result(f"dP_{index}", f"n_{index}*P_{index}", "W")
            sheet.result(f"dB_{index}", f"n_{index}*P_b_{index}", "W")
        every = range(1, len(nets) + 1)
        several = self.choice.copies != 1.0
        dynamic = " + ".join(f"dE_{index}" for index in every)
        if several:
            dynamic = f"({dynamic})*(1 + k_copy*(n_copy - 1))"
        times = "*s_copy" if several else ""
        sheet.result("E_dyn", dynamic, "J", "dynamic energy")
        sheet.result("P_leak", f"g_P*({' + '.join(f'dP_{index}' for index in every)}){times}", "W", "leakage power")
        bias = " + ".join(f"dB_{index}" for index in every)
        sheet.result("P_bias", f"({bias})*s_copy" if several else bias, "W", "bias power")
        self._overheads(several)
        path = "T_path/n_copy" if several else "T_path"
        if study.timing == "clocked" and study.leakage_accounting == "period":
            sheet.given("f", one(problem.scenario["clock_frequency"]), "1/s", "clock frequency")
            sheet.result("T", f"max(1/f, {path})", "s", "leakage is charged over the clock period, or a longer path")
        else:
            sheet.result("T", path, "s", "leakage is charged over the path delay")
        sheet.result("E_leak", "P_leak*T", "J", "leakage energy")
        sheet.result("E_stand", "(P_bias + P_ov)*T", "J", "bias and overheads")
        self._idle(nets)
        sheet.result("E_core", "E_dyn + E_leak + E_stand + E_idle", "J")
        sheet.given("eta", one(problem.overhead["supply_efficiency"]), "1", "efficiency of the supply")
        sheet.given("E_ls", one(problem.overhead["level_shifter_energy"]), "J", "level shifters")
        sheet.result(
            "E", "E_core/eta + E_ls", "J", f"energy per operation: {engineering(one(self.points.energy), 'J')}"
        )
        shares = limiting(self.points)
        for title, found in (("Delay", shares.delay_shares), ("Energy", shares.energy_shares)):
            listed = ", ".join(f"{name} {100.0 * share:.4g} %" for name, share in found.items() if share > 0.0)
            sheet.text(f"  {title} shares: {listed}")

    def _overheads(self, several: bool) -> None:
        """Standing power outside the gated supply: overheads of every copy, and the back bias."""
        sheet, problem = self.sheet, self.problem
        one_block = one(problem.overhead["overhead_power"])
        if not (several or self.choice.back_bias):
            sheet.given("P_ov", one_block, "W", "standing power of overheads")
            return
        sheet.given("P_ov1", one_block, "W", "standing power of overheads of one copy")
        formula = "P_ov1*n_copy" if several else "P_ov1"
        if self.choice.back_bias:
            sheet.given("P_bb", one(problem.mitigation["back_bias_power"]), "W", "standing power of the back bias")
            formula += " + P_bb*s_copy" if several else " + P_bb"
        sheet.result("P_ov", formula, "W", "standing power of overheads")

    def _idle(self, nets: tuple[Net, ...]) -> None:
        sheet, scenario = self.sheet, self.problem.scenario
        if self.study.idle == "none":
            sheet.given("E_idle", 0.0, "J", "idle time is not part of this study")
            return
        sheet.given("t_idle", one(scenario["idle_time"]), "s", "one idle period")
        sheet.given("n_act", one(scenario["active_cycles"]), "1", "clock cycles awake per idle period")
        if self.study.idle == "ungated":
            sheet.result("E_idle", "(P_leak + P_bias + P_ov)*t_idle/n_act", "J", "everything stays on while idle")
            return
        gating = self.problem.gating
        sheet.given("rho", one(gating["residual_leakage"]), "1", "share of the leakage left when power-gated")
        sheet.given("k_w", one(gating["wake_energy_cycles"]), "1", "wake-up in full-swing cycles of the block")
        for index, _ in enumerate(nets, start=1):
            sheet.result(f"dC_{index}", f"n_{index}*C_net_{index}", "F")
        total = " + ".join(f"dC_{index}" for index in range(1, len(nets) + 1))
        sheet.result("C_all", total, "F", "capacitance of all nets")
        times = "*s_copy" if self.choice.copies != 1.0 else ""
        formula = f"((rho*(P_leak + P_bias) + P_ov)*t_idle + k_w*C_all*V**2{times})/n_act"
        meaning = "power-gated while idle; overheads lie outside the gated supply"
        if one(self.points.gated):
            sheet.result("E_idle", formula, "J", meaning)
            return
        sheet.result("E_asleep", formula, "J", meaning)
        sheet.result("E_on", "(P_leak + P_bias + P_ov)*t_idle/n_act", "J", "everything stays on while idle")
        sheet.result("E_idle", "min(E_asleep, E_on)", "J", "gating would not pay, so the supply stays on")

    def _compare(self) -> None:
        sheet, points = self.sheet, self.points
        sheet.text("")
        sheet.text("The program's own results beside this arithmetic, in full precision")
        rows: Mapping[str, tuple[float, str]] = {
            "T_path": (one(points.time), "s"),
            "E": (one(points.energy), "J"),
            "P_leak": (one(points.leakage_power), "W"),
        }
        for symbol, (own, unit) in rows.items():
            here = sheet.values[symbol]
            if not (np.isfinite(own) and np.isfinite(here)):
                sheet.text(
                    f"  {symbol}: no number on {'both sides' if np.isnan(own) and np.isnan(here) else 'one side'}"
                )
                continue
            difference = abs(here - own) / abs(own) if own else abs(here)
            word = "agrees" if difference <= AGREEMENT else "DISAGREES: please report this"
            sheet.text(f"  {symbol}: program {own:.12g} {unit}, here {here:.12g} {unit}; {word}")


def _same(pair: SwitchPair) -> bool:
    """Tell whether both switches have the same record values."""
    return all(
        np.array_equal(getattr(pair.down, name), getattr(pair.up, name), equal_nan=True)
        for name, _, _ in _FIELDS.values()
    )
