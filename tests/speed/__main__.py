"""Nanoseconds per draw and supply of the program beside compiled kernels of the same arithmetic, and its memory.

``python -m tests.speed [--million]``: prints a table. Each kernel is compiled twice with ``-O3 -march=native``, without
and with the vector math library (``-ffast-math`` lets gcc use it). The results of both must agree with the program's
before anything is timed. ``--million`` also runs a million draws of a hand study with 1, 2 and 4 processes and compares
the bits. Times are the best of several runs of one process; nothing is asserted about them. Last, a batch of five
studies after one edit of a set, with one process and with two, through the command line.

``python -m tests.speed --demo DRAWS`` runs so many draws of the worked study with 1, 2 and 4 processes instead.
"""

from __future__ import annotations

import argparse
import ctypes
import os
import resource
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

import numpy as np

from benchmark.decide.compare import Comparison
from benchmark.decide.draw_block import DrawTask, sum_block
from benchmark.decide.uncertainty import uncertainty
from benchmark.draws.plan import plan_of
from benchmark.evaluate.batch import Batch
from benchmark.evaluate.points import design_points
from benchmark.evaluate.side import build_side
from benchmark.physics import virtual_source as vs
from benchmark.record.load import load_study
from tests.five_studies import five_studies, five_whole_studies
from tests.fixed_displacement import fixed_displacement

Array = np.ndarray
HERE = Path(__file__).parent
WORKED = HERE.parents[1] / "reports" / "always-on-hub" / "study.toml"
STRESS = HERE.parent / "data" / "stress-hand" / "study.toml"
DRAWS, SUPPLIES = 2048, 33


def library(folder: Path, name: str, *flags: str) -> ctypes.CDLL:
    """Compile the kernels."""
    made = folder / f"{name}.so"
    words = ["gcc", "-O3", "-march=native", *flags, "-shared", "-fPIC", "-o", made, HERE / "kernels.c", "-lm"]
    subprocess.run([str(word) for word in words], check=True)
    return ctypes.CDLL(str(made))


def pointer(array: Array) -> ctypes.c_void_p:
    return ctypes.c_void_p(array.ctypes.data)


def best(run: Callable[[], object], times: int = 5) -> float:
    """Least time of several runs [s]."""
    found = []
    for _ in range(times):
        started = time.perf_counter()
        run()
        found.append(time.perf_counter() - started)
    return min(found)


def chain_case(libraries: dict[str, ctypes.CDLL]) -> None:
    """Device model, stage, chain, energy: the whole path of one side at draws x supplies."""
    study, _ = load_study(STRESS)
    pair = study.pair(study.headline)
    rng = np.random.default_rng(1)
    names = ("actuator_coefficient", "resistance_unstressed", "stack_thickness", "input_capacitance")
    values = {name: value.at(0) for name, value in study.candidate.technology.values.items()}
    columns = {
        f"hand-stress-gated.{name}": float(values[name].si[0]) * np.exp(0.1 * rng.standard_normal(DRAWS))
        for name in names
    }
    problem = build_side(study, study.candidate, "candidate", pair, Batch(DRAWS, columns))
    supply = np.linspace(0.2, 0.4, SUPPLIES)

    def ours() -> tuple[Array, Array]:
        points = design_points(problem, supply[None, :])
        return points.time, points.energy

    def column(name: str) -> Array:
        key = f"hand-stress-gated.{name}"
        return np.ascontiguousarray(columns[key]) if key in columns else np.full(DRAWS, float(values[name].si[0]))

    inputs = [
        column(name)
        for name in (
            "actuator_coefficient", "pressure_per_coefficient_voltage", "resistance_unstressed", "resistance_slope",
            "stack_thickness", "stack_sound_speed", "input_capacitance",
        )
    ]  # fmt: skip
    moment, energy = np.empty((DRAWS, SUPPLIES)), np.empty((DRAWS, SUPPLIES))

    def kernel(code: ctypes.CDLL) -> Callable[[], None]:
        def run() -> None:
            code.chain(
                ctypes.c_size_t(DRAWS), ctypes.c_size_t(SUPPLIES), *map(pointer, inputs), pointer(supply),
                ctypes.c_double(20.0), ctypes.c_double(0.05), pointer(moment), pointer(energy),
            )  # fmt: skip

        return run

    t, e = ours()
    for name, code in libraries.items():
        kernel(code)()
        worst = max(float(np.abs(moment / t - 1).max()), float(np.abs(energy / e - 1).max()))
        if worst > 1e-3:  # the program adds R_on to the open switch and guards that do not matter here
            message = f"{name}: kernel and program differ by {worst:.2g}"
            raise SystemExit(message)
    report(
        "stress-gated chain, whole path",
        DRAWS * SUPPLIES,
        best(ours),
        {n: best(kernel(c)) for n, c in libraries.items()},
    )


def current_case(libraries: dict[str, ctypes.CDLL]) -> None:
    """Drain current of the virtual-source transistor: the arithmetic that references spend most time on."""
    n = DRAWS * SUPPLIES
    rng = np.random.default_rng(2)
    gate, drain = rng.uniform(0.1, 0.7, n), rng.uniform(0.05, 0.7, n)
    threshold = rng.uniform(0.2, 0.35, n)
    phi, width, velocity, length, mobility = 0.02585, 1.0e-6, 1.0e5, 2.0e-8, 0.02
    transistor = vs.Transistor(
        threshold=threshold, velocity=velocity, mobility=mobility, length=length, width=width, thermal_voltage=phi,
        barrier_lowering=0.05, saturation_exponent=1.8, fermi_width=3.5, slope_factor=1.2, punch_through=0.0,
        inversion_capacitance=0.025, source_resistance=1.0e-4, drain_resistance=1.0e-4, body_factor=None,
        body_potential=0.9,
    )  # fmt: skip
    out = np.empty(n)

    def ours() -> Array:
        # in pieces that stay in the cache, as the supply search gives them
        return np.concatenate(
            [
                vs.drain_current(_part(transistor, slice(i, i + 8192)), gate[i : i + 8192], drain[i : i + 8192])
                for i in range(0, n, 8192)
            ]
        )

    def kernel(code: ctypes.CDLL) -> Callable[[], None]:
        def run() -> None:
            code.drain_current(
                ctypes.c_size_t(n), pointer(gate), pointer(drain), pointer(threshold),
                *map(ctypes.c_double, (phi, 0.05, 1.8, 3.5, 1.2, 0.025, width, velocity, velocity * length / mobility,
                                       1.0e-4, 1.0e-4)),
                pointer(out),
            )  # fmt: skip

        return run

    current = ours()
    for name, code in libraries.items():
        kernel(code)()
        worst = float(np.abs(out / current - 1).max())
        if worst > 1e-6:
            message = f"{name}: kernel and program differ by {worst:.2g}"
            raise SystemExit(message)
    report("virtual-source current", n, best(ours), {m: best(kernel(c)) for m, c in libraries.items()})


def _part(t: vs.Transistor, which: slice) -> vs.Transistor:
    from dataclasses import replace

    return replace(t, threshold=np.asarray(t.threshold)[which])


def report(name: str, elements: int, ours: float, kernels: dict[str, float]) -> None:
    print(f"{name}: {1e9 * ours / elements:.1f} ns per draw and supply")
    for kernel, seconds in kernels.items():
        print(f"    {kernel}: {1e9 * seconds / elements:.1f} ns; the program takes {ours / seconds:.1f} times as long")


def draw_task(path: Path, draws: int) -> DrawTask:
    """Draws of a study at its headline pair, with what was chosen at the best estimate."""
    study, _ = load_study(path)
    pair = study.pair(study.headline)
    comparison = Comparison(study, pair, Batch.best_estimate())
    frozen = comparison.frozen_choices(comparison.outcome(study.policy.primary))
    return DrawTask(study, pair, study.policy.primary, frozen, plan_of(draws))


def draws_case(million: bool) -> None:
    """Draws of a whole hand study, both sides, verdict included: time, memory, bits."""
    with tempfile.TemporaryDirectory() as folder:
        study = fixed_displacement().write(Path(folder))
        small, large = draw_task(study, 2**13), draw_task(study, 2**20)
    seconds = best(lambda: [sum_block(small, block) for block in range(small.plan.blocks)], 3)
    print(f"hand study, both sides at declared points: {1e6 * seconds / small.plan.draws:.1f} us per draw")
    if million:
        many_draws("hand study", large)


def many_draws(name: str, task: DrawTask) -> None:
    """Run the draws with 1, 2 and 4 processes."""
    found = {}
    for jobs in (1, 2, 4):
        started = time.perf_counter()
        found[jobs] = repr(uncertainty(task, jobs))
        seconds = time.perf_counter() - started
        own, workers = (
            resource.getrusage(who).ru_maxrss / 1024 for who in (resource.RUSAGE_SELF, resource.RUSAGE_CHILDREN)
        )
        print(f"{name}: {task.plan.draws} draws, {jobs} process(es): {seconds:.1f} s, "
              f"{1e3 * seconds / task.plan.draws:.2f} ms per draw, peak memory {own:.0f} MB, "
              f"largest worker {workers:.0f} MB", flush=True)  # fmt: skip
    print(f"{name}: same bits with 1, 2 and 4 processes: {len(set(found.values())) == 1}")


def batch_case() -> None:
    """``evenload batch``: five studies, one edit of a set, one table; records with reports are written."""
    kinds: dict[str, tuple[Callable[[Path, str], None], str, str]] = {
        "hand studies": (five_studies, "200.0", "170.0"),
        "studies of two device models, six policies, ranges": (five_whole_studies, "1", "0.97"),
    }
    for name, (write, old, new) in kinds.items():
        for jobs in (1, 2):
            with tempfile.TemporaryDirectory() as folder:
                place = Path(folder)
                write(place / "all", old)
                batch_run(place, jobs)
                write(place / "all", new)
                seconds, used, said = batch_run(place, jobs)
            print(f"batch of five {name}, {jobs} process(es): {seconds:.1f} s "
                  f"({used.ru_utime + used.ru_stime:.1f} s of processor time), "
                  f"largest process {used.ru_maxrss / 1024:.0f} MB; {said}")  # fmt: skip


def batch_run(place: Path, jobs: int) -> tuple[float, resource.struct_rusage, str]:
    """Wall time [s], what all processes used (memory: the largest of them), and what is counted in the last line."""
    words = ["-c", "from benchmark.cli import main; main()", "batch", "all", "--out", "records", "--jobs", str(jobs)]
    started = time.perf_counter()
    with subprocess.Popen([sys.executable, *words], cwd=place, stdout=subprocess.PIPE, text=True) as child:
        assert child.stdout is not None
        said = child.stdout.read().strip().splitlines()
        _, status, used = os.wait4(child.pid, 0)
        child.returncode = os.waitstatus_to_exitcode(status)
    if child.returncode not in (0, 20):
        raise SystemExit("\n".join(said))
    return time.perf_counter() - started, used, " ".join(said[-1].split("; ")[0].split())


def main() -> None:
    options = argparse.ArgumentParser(description=__doc__)
    options.add_argument("--million", action="store_true", help="also run a million draws with 1, 2 and 4 processes")
    options.add_argument("--demo", type=int, metavar="DRAWS", help="only so many draws of the worked study, likewise")
    asked = options.parse_args()
    if asked.demo:
        many_draws("worked study", draw_task(WORKED, asked.demo))
        return
    with tempfile.TemporaryDirectory() as folder:
        libraries = {
            "kernel": library(Path(folder), "plain"),
            "kernel with the vector math library": library(Path(folder), "vector", "-ffast-math"),
        }
        chain_case(libraries)
        current_case(libraries)
    draws_case(asked.million)
    batch_case()


if __name__ == "__main__":
    main()
