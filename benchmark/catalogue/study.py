"""Value names of studies and the product classes (layer 1)."""

from __future__ import annotations

from benchmark.catalogue.quantity import Quantity

__all__ = ["PRODUCT_CLASSES", "STUDY_QUANTITIES"]

#: product class -> what usually decides (from memory, common practice, no source)
PRODUCT_CLASSES: dict[str, str] = {
    "always-on hub": "leakage over long idle times; state retention; power-gated high-threshold CMOS is the rival",
    "microcontroller": "minimum energy with a deadline; cold delay near threshold",
    "mobile core": "mix of burst speed and idle leakage",
    "server core": "energy at equal delay, power density",
    "multiply-accumulate array": "throughput per area at a power-density cap",
    "memory periphery": "driving long lines at a voltage set by the cell",
    "other": "stated in the study",
}

STUDY_QUANTITIES: tuple[Quantity, ...] = (
    Quantity("clock_frequency", "f", "clock frequency; its inverse is the cycle time", "MHz", 0.001, 1.0e4),
    Quantity("activity", "a", "rising transitions per clock cycle per net", "1", 1.0e-5, 1.0, "fraction"),
    Quantity(
        "busiest_activity",
        "a_max",
        "rising transitions per clock cycle of the busiest net",
        "1",
        1.0e-3,
        1.0,
        "fraction",
    ),
    Quantity("duty", "D", "share of the life in which the block is clocked", "1", 1.0e-6, 1.0, "fraction"),
    Quantity("logic_depth", "N", "logic stages between registers", "1", 2.0, 100.0, "count"),
    Quantity("gate_count", "G", "logic gates in the block, without registers", "1", 1.0, 1.0e9, "count"),
    Quantity("register_count", "G_r", "registers in the block", "1", 1.0, 1.0e8, "nonnegative"),
    Quantity("fan_out", "F", "driven inputs per net", "1", 0.5, 32.0, "nonnegative"),
    Quantity("average_net_length", "L", "average length of a net", "um", 0.1, 1.0e4, "nonnegative"),
    Quantity(
        "average_net_pitches",
        "L_p",
        "average length of a net in gate pitches of each technology",
        "1",
        0.5,
        1.0e3,
        "nonnegative",
    ),
    Quantity(
        "rent_exponent",
        "p",
        "Rent's exponent of the block: terminals of a part grow with the number of its gates to this power",
        "1",
        0.4,
        0.8,
        "share",
    ),
    Quantity("word_length", "N_bit", "bits of a word", "1", 1.0, 128.0, "count"),
    Quantity("group_bits", "m", "bits of a word that one group of complex gates adds at once", "1", 1.0, 5.0, "count"),
    Quantity("bit_pitch", "L_bit", "width of one bit of a word, fixed by the floor plan", "um", 0.02, 100.0),
    Quantity(
        "bit_gate_pitches", "L_bp", "width of one bit of a word in gate pitches of each technology", "1", 0.5, 50.0
    ),
    Quantity("row_count", "N_row", "cells on a bit line of a memory", "1", 2.0, 4096.0, "count"),
    Quantity("column_count", "N_col", "cells on a word line of a memory", "1", 1.0, 4096.0, "count"),
    Quantity("memory_cell_width", "w_mem", "width of a memory cell, along the word line", "um", 0.05, 10.0),
    Quantity("memory_cell_height", "h_mem", "height of a memory cell, along the bit line", "um", 0.05, 10.0),
    Quantity(
        "memory_cell_word_line_load",
        "C_wl",
        "load of one memory cell on its word line, wire not included",
        "fF",
        0.01,
        10.0,
        "nonnegative",
    ),
    Quantity(
        "memory_cell_bit_line_load",
        "C_bl",
        "load of one memory cell on a bit line, wire not included",
        "fF",
        0.01,
        10.0,
        "nonnegative",
    ),
    Quantity(
        "memory_cell_read_current",
        "I_read",
        "current with which a memory cell discharges its bit line",
        "uA",
        0.1,
        500.0,
    ),
    Quantity("memory_cell_supply", "V_cell", "supply of the memory cells, word lines and precharge", "V", 0.1, 5.0),
    Quantity(
        "bit_line_swing", "dV_bl", "difference on the bit lines at which the sense amplifier starts", "V", 0.01, 1.0
    ),
    Quantity("line_length", "L_line", "length of a repeated line, fixed by the floor plan", "um", 10.0, 5.0e4),
    Quantity("repeater_count", "k_rep", "repeaters of a line, the driver included", "1", 1.0, 1000.0, "count"),
    Quantity("driver_copies", "h_drv", "parallel copies of an inverter in one line driver", "1", 1.0, 1000.0, "count"),
    Quantity("stage_count", "N_ring", "stages of a ring", "1", 3.0, 101.0, "count"),
    Quantity("residual_leakage", "r", "share of the leakage left when power-gated", "1", 1.0e-4, 1.0, "fraction"),
    Quantity(
        "wake_energy_cycles",
        "k_w",
        "energy of one wake-up in full-swing cycles of the whole block (C V^2)",
        "1",
        0.1,
        1000.0,
        "nonnegative",
    ),
    Quantity(
        "routing_overhead",
        "k_copy",
        "dynamic energy that each further parallel copy adds to every operation, as a share of it",
        "1",
        0.01,
        0.5,
        "nonnegative",
    ),
    Quantity(
        "repeated_share",
        "g_copy",
        "share of the block that each further parallel copy repeats: its leakage, bias and wake-up energy",
        "1",
        0.05,
        1.0,
        "fraction",
    ),
    Quantity(
        "area_share",
        "h_copy",
        "area that each further parallel copy adds, routing included, as a share of the block's",
        "1",
        0.05,
        5.0,
        "nonnegative",
    ),
    Quantity("body_factor", "gamma_b", "threshold shift per volt of back bias, V per V", "1", 0.01, 0.3, "nonnegative"),
    Quantity(
        "back_bias_power",
        "P_bb",
        "standing power of a back bias other than 0: its supply, and the junction leakage it causes in the block",
        "nW",
        1.0e-6,
        1.0e6,
        "nonnegative",
    ),
    Quantity("idle_time", "t_idle", "length of one idle period", "s", 1.0e-6, 1.0e5, "nonnegative"),
    Quantity("active_cycles", "N_act", "clock cycles awake per idle period", "1", 1.0, 1.0e12),
    Quantity(
        "level_shifter_energy", "E_ls", "energy of level shifters per operation", "fJ", 1.0e-3, 1.0e6, "nonnegative"
    ),
    Quantity("level_shifter_delay", "t_ls", "delay of level shifters per operation", "ps", 0.1, 1.0e4, "nonnegative"),
    Quantity("supply_efficiency", "eta", "efficiency of generating the supply", "1", 0.3, 1.0, "share"),
    Quantity(
        "overhead_power",
        "P_ov",
        "standing power of bias, pumps and drivers of the block",
        "nW",
        1.0e-6,
        1.0e6,
        "nonnegative",
    ),
)
