"""A run killed at any point leaves the old record or the new one, whole; the next run clears away what is left."""

from __future__ import annotations

import random
import shutil
import signal
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

import pytest

from tests.faults.children import Children, Died
from tests.faults.guard import KEY
from tests.studies import hub

OLD = ["run", "study.toml", "--out", "record", "--freeze-time", "then"]
NEW = [*OLD, "--set", "activity=0.1"]

Tree = Mapping[str, bytes]


def tree(folder: Path) -> Tree:
    """Every file of a folder; none when it is not there."""
    return {str(path.relative_to(folder)): path.read_bytes() for path in sorted(folder.rglob("*")) if path.is_file()}


@dataclass(frozen=True)
class Bench:
    """A study, and what its two records look like when nothing is killed."""

    evenload: Children
    folder: Path
    old: Tree
    new: Tree
    known: Path
    seconds: float

    def run(self, arguments: list[str], **told: object) -> Died:
        return self.evenload.run(self.folder, *arguments, undrawn=True, **told)

    def start(self, over_a_record: bool) -> None:
        """Bring the folder to where a killed run starts."""
        shutil.rmtree(self.folder / "record", ignore_errors=True)
        if over_a_record:
            shutil.copytree(self.known / "old", self.folder / "record")

    def new_record(self) -> str:
        """The new result, to be written without being worked out again."""
        return str(self.known / "new" / "record.json")

    def judge(self, over_a_record: bool) -> str:
        """Which record there is after a kill: it must be whole."""
        there = self.folder / "record"
        if not there.exists():
            assert not over_a_record, "the old record is lost"
            return "none"
        found = tree(there)
        assert found in ((self.old, self.new) if over_a_record else (self.new,)), "half a record"
        return "new" if found == self.new else "old"

    def next_run(self) -> None:
        """The next run is not disturbed, and nothing of the killed one stays."""
        assert self.run(NEW, known=self.new_record()).status == 0
        assert tree(self.folder / "record") == self.new
        assert sorted(path.name for path in self.folder.iterdir()) == ["nodes", "record", "study.toml"]


@pytest.fixture(scope="module")
def bench(evenload: Children, tmp_path_factory: pytest.TempPathFactory) -> Bench:
    folder, known = tmp_path_factory.mktemp("killed"), tmp_path_factory.mktemp("known")
    hub().write(folder)
    trees, seconds = {}, 0.0
    for name, arguments in (("new", NEW), ("old", OLD)):
        died = evenload.run(folder, *arguments, undrawn=True)
        assert died.status == 0, died.err
        trees[name] = tree(folder / "record")
        (folder / "record").rename(known / name)
        seconds = died.seconds
    assert trees["old"] != trees["new"]
    assert len(trees["new"]) > 10
    return Bench(evenload, folder, trees["old"], trees["new"], known, seconds)


@pytest.mark.parametrize(
    ("over_a_record", "no_exchange"),
    [(True, False), (False, False), (True, True)],
    ids=["over", "fresh", "two renames"],
)
def test_killed_at_a_step_in_the_file_system(bench: Bench, over_a_record: bool, no_exchange: bool):
    """At steps from the first to the last, among them all around the swap."""
    bench.start(over_a_record)
    last = bench.run(NEW, kill_at=10**9, no_exchange=no_exchange, known=bench.new_record()).steps
    assert last > 20
    rng = random.Random(f"{KEY}/killed/{over_a_record}/{no_exchange}")
    found = set()
    wholes = len(bench.new)
    steps = sorted({1, 2, last, *range(wholes, wholes + 8), *rng.sample(range(1, last), 8)})
    for step in [step for step in steps if 0 < step <= last]:
        bench.start(over_a_record)
        died = bench.run(NEW, kill_at=step, no_exchange=no_exchange, known=bench.new_record())
        assert died.status == -signal.SIGKILL
        if no_exchange and not (bench.folder / "record").exists():
            found.add("between the renames")  # the system cannot exchange folders: the next run puts the old one back
        else:
            found.add(bench.judge(over_a_record))
        bench.next_run()
    assert {"new", "old" if over_a_record else "none"} <= found


@pytest.mark.parametrize("over_a_record", [True, False], ids=["over", "fresh"])
def test_killed_at_a_random_moment(bench: Bench, over_a_record: bool):
    """Random moments from the start to a little after the usual end, until enough of them came before it."""
    rng = random.Random(f"{KEY}/moments/{over_a_record}")
    killed = 0
    for _ in range(60):
        bench.start(over_a_record)
        died = bench.run(NEW, kill_after=rng.uniform(0.0, 1.1) * bench.seconds)
        assert died.status in (0, -signal.SIGKILL)
        killed += died.status != 0
        bench.judge(over_a_record)
        bench.next_run()
        if killed >= 8:
            break
    assert killed >= 5


def test_killed_while_drawing(evenload: Children, tmp_path: Path):
    """The whole writing, with charts and report: killed early in it and among the figures."""
    hub().write(tmp_path)
    assert evenload.run(tmp_path, *OLD, undrawn=True).status == 0
    before = tree(tmp_path / "record")
    for step in (8, 40):
        died = evenload.run(tmp_path, *NEW, kill_at=step)
        assert died.status == -signal.SIGKILL
        assert tree(tmp_path / "record") == before
    assert evenload.run(tmp_path, *OLD, undrawn=True).status == 0
    assert sorted(path.name for path in tmp_path.iterdir()) == ["nodes", "record", "study.toml"]


def test_the_folder_of_a_run_that_is_still_going_is_left_alone(evenload: Children, tmp_path: Path):
    from benchmark.record.write import write_folder

    hub().write(tmp_path)

    def fill(inside: Path) -> None:
        assert evenload.run(tmp_path, *OLD, undrawn=True).status == 0
        assert inside.is_dir()
        (inside / "record.json").write_text("{}")

    write_folder(tmp_path / "record", fill)
    assert tree(tmp_path / "record") == {"record.json": b"{}"}
    assert sorted(path.name for path in tmp_path.iterdir()) == ["nodes", "record", "study.toml"]


def test_an_old_record_waiting_between_two_renames_is_put_back(tmp_path: Path):
    """Where folders cannot be exchanged a kill may leave none; the next run puts the old one back first."""
    from benchmark.record.write import write_folder

    waiting = tmp_path / ".record.evenload-abcdefgh.old"
    waiting.mkdir()
    (waiting / "record.json").write_text("old")
    half = tmp_path / ".record.evenload-abcdefgh"
    half.mkdir()

    def fails(inside: Path) -> None:
        assert (tmp_path / "record" / "record.json").read_text() == "old"
        raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        write_folder(tmp_path / "record", fails)
    assert tree(tmp_path / "record") == {"record.json": b"old"}
    assert [path.name for path in tmp_path.iterdir()] == ["record"]


def test_what_is_not_ours_beside_a_record_stays(tmp_path: Path):
    from benchmark.record.write import write_folder

    for name in (".record.settings", ".record", "record.old", ".other.evenload-abcdefgh", "record.evenload-abcdefgh"):
        (tmp_path / name).mkdir()
    write_folder(tmp_path / "record", lambda inside: (inside / "record.json").write_text("{}") and None)
    assert len(list(tmp_path.iterdir())) == 6
