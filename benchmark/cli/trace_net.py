"""One net of a traced design point: capacitances, delay of both edges, energy, leakage (layer 10)."""

from __future__ import annotations

import dataclasses
from typing import Any

import numpy as np

from benchmark.circuits.cells import Cell, Edge
from benchmark.circuits.circuit import Circuit, Net
from benchmark.circuits.motion import HALF, motion_charges
from benchmark.circuits.sized import EDGES, OTHER, Sized, stack_ratio
from benchmark.circuits.stage import StageDetail
from benchmark.cli.arithmetic import Sheet
from benchmark.devices.record import Switch, SwitchPair
from benchmark.evaluate.side import SideProblem

__all__ = ["NetArithmetic", "edges_of", "one"]

_EDGE_NAME: dict[Edge, str] = {"down": "falling", "up": "rising"}


def one(value: Any) -> float:
    """Return the only number of an array."""
    array = np.asarray(value, dtype=np.float64)
    if array.size != 1:
        message = f"one number expected, found {array.shape}"
        raise ValueError(message)
    return float(array.reshape(-1)[0])


def edges_of(pair: SwitchPair) -> tuple[tuple[Edge, Switch], tuple[Edge, Switch]]:
    """Return both switches with the edge each drives."""
    return ("down", pair.down), ("up", pair.up)


@dataclasses.dataclass(frozen=True)
class NetArithmetic:
    """Writes the arithmetic of single nets on a sheet that already holds the record's symbols.

    ``copies``: the size knob means copies of the whole switch, so inputs grow with it.
    """

    sheet: Sheet
    problem: SideProblem
    circuit: Circuit
    size: float
    copies: bool

    def burden(self, net: Net) -> None:
        """Write the wire, the fixed load and the layout parasitic of the driven inputs."""
        sheet = self.sheet
        layer = self.problem.wires.layer(net.layer, self.circuit.layers)
        if net.layer != "local":
            sheet.given("r_layer", one(layer.resistance_per_length), "ohm/m", f"layer {net.layer}")
            sheet.given("c_layer", one(layer.capacitance_per_length), "F/m", f"layer {net.layer}")
        r, c = ("r", "c") if net.layer == "local" else ("r_layer", "c_layer")
        if net.length_unit == "gate_pitch":
            sheet.given("L_p", one(net.wire_length), "1", "length in gate pitches")
            sheet.result("L", "L_p*pitch", "m")
        else:
            sheet.given("L", one(net.wire_length), "m", "wire length")
        sheet.result("C_wire", f"{c}*L", "F")
        sheet.result("R_wire", f"{r}*L", "ohm")
        sheet.given("C_fixed", one(net.fixed_load), "F", "fixed load")
        pins = " + ".join(f"{one(load.count):.6g}*C_pin" for load in net.loads) or "0*C_pin"
        sheet.result("C_pins", pins, "F", "layout parasitic of the driven inputs")
        if not net.plain:
            sheet.given("h", one(net.copies), "1", "parallel copies of the driver")
            sheet.given("c_load", one(net.load_per_length), "F/m", "fixed loads along the wire, per length")
            sheet.result("C_spread", "c_load*L", "F", "fixed loads along the wire")
            sheet.result("C_near", "h*C_pin", "F", "layout parasitic of the driver")

    def _inputs(self, net: Net, pair: SwitchPair, symbol: str, each: str, unit: str) -> None:
        """Sum over the driven inputs of a quantity of the record, ``each`` per switch."""
        terms = []
        for position, load in enumerate(net.loads, start=1):
            parts = []
            for edge, switch in edges_of(pair):
                widths = load.cell.input_widths(load.input, "unit")[edge]
                grows = self.copies or switch.input_scales_with_size
                parts.append(f"{each}_{edge}*{sum(widths) if grows else len(widths):g}" + ("*size" if grows else ""))
            name = f"{symbol}_{position}" if len(net.loads) > 1 else f"{symbol}_each"
            self.sheet.result(name, " + ".join(parts), unit, f"one input {load.cell.name}.{load.input}")
            terms.append(f"{one(load.count):.6g}*{name}")
        if terms:
            self.sheet.result(symbol, " + ".join(terms), unit, "all driven inputs")
        else:
            self.sheet.given(symbol, 0.0, unit, "no driven inputs")

    def _own(self, net: Net, symbol: str, each: str, driving: Edge, share: bool) -> None:
        """Capacitance of the driver's own terminals: ends at the output plus internal nodes."""
        cell = net.driver
        parts = []
        for edge in EDGES:
            width = cell.output_width(edge, "unit")
            for node in cell.internal_nodes(edge, "unit"):
                width += node.width * (node.share if share and edge == driving else 1.0)
            parts.append(f"{each}_{edge}*{width:.6g}")
        copies = "" if net.plain else "*h"
        self.sheet.result(symbol, f"({' + '.join(parts)})*size{copies}", "F", "own terminals")

    def delay(self, net: Net, pair: SwitchPair, program: StageDetail, symbol: str) -> None:
        """Write both edges and their mean; ``program``: the estimator's stage, for factors a rule has to solve."""
        sheet = self.sheet
        self.burden(net)
        self._inputs(net, pair, "C_load", "C_in", "F")
        if not net.gated:
            self._other(net, program, symbol)
            return
        copies, near, line = ("", "C_pin", "C_wire") if net.plain else ("/h", "C_near", "(C_wire + C_spread)")
        sized = Sized(pair, self.size, "copies" if self.copies else "width")
        for edge in EDGES:
            closing, opening, tag = sized.switch(edge), OTHER[edge], edge
            ratios = [
                one(stack_ratio(closing.stack_on, k)) * inverse / k for k, inverse in net.driver.paths(edge, "unit")
            ]
            ratio = float(np.max(ratios))
            sheet.text(f"  {_EDGE_NAME[edge]} output edge: the pull-{edge} network drives")
            sheet.result(f"Rp_{tag}", f"R_{tag}*{ratio:.10g}/size{copies}", "ohm", "worst path")
            self._own(net, f"C_self_{tag}", "C_td", edge, share=True)
            depth = net.driver.depth(edge) if closing.stack_time == "sequential" else 1
            sheet.result(f"t_int_{tag}", f"max({depth}*t_on_{tag}, t_off_{opening})", "s", "load-independent")
            detail = program.falling if edge == "down" else program.rising
            self._factors(tag, opening, one(detail.factor), one(detail.wire_factor))
            far = "(C_load + C_pins + C_fixed)"
            sheet.result(
                f"t_rc_{tag}",
                f"F_{tag}*(Rp_{tag}*(C_self_{tag} + {near} + {line} + {far}) + R_wire*{far}) + W_{tag}*R_wire*{line}",
                "s",
            )
            sheet.result(f"t_{tag}", f"t_int_{tag} + t_rc_{tag}", "s", f"{_EDGE_NAME[edge]} edge")
        sheet.result(symbol, "(t_down + t_up)/2", "s", "delay of one stage, mean of both edges")

    def _other(self, net: Net, program: StageDetail, symbol: str) -> None:
        """Write the delay of a net that no gate drives on both edges: discharged from outside, or a latch."""
        sheet = self.sheet
        if net.discharge is None:
            sheet.given(
                "t_latch", one(program.delay) - one(program.delay_parts["transit"]), "s", "regeneration, solved"
            )
            sheet.given(
                "t_wait", one(program.delay_parts["transit"]), "s", "longer by switches that answer late, solved"
            )
            sheet.result(symbol, "t_latch + t_wait", "s", "delay of the latch")
            return
        self._own(net, "C_self_down", "C_td", "down", share=True)
        sheet.given("I_cell", one(net.discharge.current), "A", "current that discharges the net at its far end")
        sheet.given("V_swing", one(net.swing), "V", "swing of this net")
        sheet.result("C_line", "C_wire + C_spread", "F", "along the wire")
        sheet.result("C_end", "C_self_down + C_near + C_load + C_pins + C_fixed", "F", "at the near end")
        sheet.result(
            symbol,
            "(C_line + C_end)*V_swing/I_cell + R_wire*C_line*(C_line/6 + C_end/2)/(C_line + C_end)",
            "s",
            "delay of the falling edge",
        )

    def _factors(self, tag: str, opening: str, factor: float, wire: float) -> None:
        sheet, rule = self.sheet, self.problem.study.delay_rule
        if rule == "step":
            sheet.result(f"F_{tag}", "ln(2)", "1", "delay rule step")
            sheet.given(f"W_{tag}", wire, "1", "delay rule step, distributed wire")
        elif rule == "chain":
            sheet.result(f"F_{tag}", f"max(0.6, ln(1/(1 - w_{opening})))", "1", "delay rule chain")
            sheet.result(f"W_{tag}", f"0.1 + 0.4*F_{tag}", "1", "delay rule chain")
        else:
            sheet.given(f"F_{tag}", factor, "1", f"solved by the delay rule {rule}")
            sheet.given(f"W_{tag}", wire, "1", f"solved by the delay rule {rule}")

    def energy(self, net: Net, pair: SwitchPair, index: int) -> None:
        """Write the energy of one rising transition as ``E_<index>``; needs the edges of ``delay`` on the sheet."""
        sheet = self.sheet
        self._inputs(net, pair, "Q_load", "Q_in", "C")
        self._inputs(net, pair, "E_loss", "E_x", "J")
        self._own(net, "C_self", "C_t", "down", share=False)
        if net.swing is None:
            swing = rail = "V"
        else:
            sheet.given("V_swing", one(net.swing), "V", "swing of this net")
            swing, rail = "V_swing", "V_swing" if net.swing_from == "own-rail" else "V"
        if net.discharge is not None:
            sheet.given("V_rail", one(net.discharge.rail), "V", "rail that restores this net")
            rail = "V_rail"
        near = "C_pin" if net.plain else "C_spread + C_near"
        total = f"Q_load/V + C_self + C_wire + C_fixed + {near} + C_pins"
        sheet.result(f"C_net_{index}", total, "F", "average over the swing")
        parts = f"{rail}*{swing}*C_net_{index} + E_loss"
        if self.problem.study.short_circuit == "estimated" and net.gated:
            sheet.result("t_ramp", "t_rc_down + t_rc_up", "s", "RC part of both edges")
            terms = []
            for edge, opening in OTHER.items():
                name = f"E_short_{_EDGE_NAME[edge]}"
                sheet.result(
                    name,
                    f"V*t_ramp*R_{opening}/Rp_{opening}*J_{opening} + V**2/(Rp_{edge} + Rp_{opening})"
                    f"*max(0, t_off_{opening} - t_on_{edge})",
                    "J",
                )
                terms.append(name)
            parts += f" + {' + '.join([*terms, *self._motion(pair, f'({parts})/V')])}"
        sheet.result(f"E_{index}", parts, "J", "one rising transition (one full cycle)")

    def _motion(self, pair: SwitchPair, node: str) -> list[str]:
        """Write the charge that runs through while actuators move; return the names of its energies, if any."""
        charges = {edge: one(charge) for edge, charge in motion_charges(pair).items()}
        if not any(charges.values()):
            return []
        sheet, names = self.sheet, []
        sheet.result("Q_node", node, "C", "charge of the node, losses included")
        for edge, opening in OTHER.items():
            tag = _EDGE_NAME[edge]
            sheet.given(f"Q_way_{tag}", charges[edge], "C", "through unit switches on the way of their actuators")
            sheet.result(f"Q_motion_{tag}", f"Q_way_{tag}*(R_{edge} + R_{opening})/(Rp_{edge} + Rp_{opening})", "C")
            name = f"E_motion_{tag}"
            sheet.result(name, f"V*Q_motion_{tag}**2/(Q_motion_{tag} + {HALF:g}*Q_node)", "J", "output lags behind")
            names.append(name)
        return names

    def leakage(self, net: Net, pair: SwitchPair, index: int) -> None:
        """Write leakage and bias power of the driving cell as ``P_<index>`` and ``P_b_<index>``."""
        sheet, cell = self.sheet, net.driver
        copies = "" if net.plain else f"*{one(net.copies):g}"
        weights = _state_weights(pair, cell)
        sheet.result(
            "I_path",
            f"({weights['down']:.10g}*I_off_down + {weights['up']:.10g}*I_off_up)*size",
            "A",
            "open paths, mean over input states",
        )
        inputs, body, bias = [], [], []
        for edge, switch in edges_of(pair):
            widths = cell.widths(edge, "unit")
            grows = self.copies or switch.input_scales_with_size
            count = f"{sum(widths) if grows else len(widths):g}" + ("*size" if grows else "")
            inputs.append(f"{count}*(I_in_high_{edge} + I_in_low_{edge})/2")
            body.append(f"{sum(widths):g}*size*I_body_{edge}")
            bias.append(f"{count}*P_bias_{edge}")
        sheet.result("I_input", " + ".join(inputs), "A", "through the inputs, high half of the time")
        sheet.result("I_bulk", " + ".join(body), "A", "into the body")
        sheet.result(f"P_{index}", f"V*(I_path + I_input + I_bulk){copies}", "W", "leakage of one cell")
        total = " + ".join(bias)
        sheet.result(f"P_b_{index}", f"({total}){copies}" if copies else total, "W", "bias of one cell")


def _state_weights(pair: SwitchPair, cell: Cell) -> dict[Edge, float]:
    """How many open unit switches leak at the full supply, on average over input states, by network."""
    found: dict[Edge, float] = {}
    for edge in EDGES:
        leaks, tight = np.ones((1, 1, 1)), np.zeros((1, 1, 1))
        probe = dataclasses.replace(
            pair,
            down=dataclasses.replace(pair.down, off_current_path=leaks if edge == "down" else tight),
            up=dataclasses.replace(pair.up, off_current_path=leaks if edge == "up" else tight),
        )
        found[edge] = one(Sized(probe).leakage_current(cell)["path"])
    return found
