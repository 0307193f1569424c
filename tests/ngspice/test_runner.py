"""The runner believes nothing it has not seen: each way ngspice fails without saying so in its exit status."""

from __future__ import annotations

import pytest

from tests.ngspice import runner
from tests.ngspice.runner import SpiceError, run_deck

pytestmark = pytest.mark.spice

DIVIDER = """divider
v1 a 0 2
r1 a b 1k
r2 b 0 1k
.control
set wr_singlescale
set wr_vecnames
set numdgt=12
op
let half = v(b)
print half
{more}
quit 0
.endc
.end
"""


def test_a_good_run_gives_its_numbers_and_tables():
    run = run_deck(DIVIDER.format(more="dc v1 0 2 1\nwrdata t.txt v(b)"), ["half"], {"t.txt": ("v(b)",)})
    assert run.numbers == {"half": 1.0}
    assert run.tables["t.txt"]["v(b)"].tolist() == [0.0, 0.5, 1.0]


@pytest.mark.parametrize(
    "more",
    [
        "meas tran never WHEN v(b)=5",  # a failed measurement
        "print never",  # an unknown vector
        "let never = 1/0\nprint never",  # infinity
    ],
)
def test_what_was_not_measured_is_an_error_although_the_exit_status_is_0(more):
    with pytest.raises(SpiceError, match="did not print a finite never"):
        run_deck(DIVIDER.format(more=more), ["half", "never"])


def test_a_table_must_be_there_with_its_columns():
    with pytest.raises(SpiceError, match="wrote no missing"):
        run_deck(DIVIDER.format(more=""), tables={"missing.txt": ("v(b)",)})
    with pytest.raises(SpiceError, match=r"without \['v\(nowhere\)'\]"):
        run_deck(DIVIDER.format(more="dc v1 0 2 1\nwrdata t.txt v(b)"), tables={"t.txt": ("v(nowhere)",)})


def test_a_run_that_does_not_end_is_stopped():
    with pytest.raises(SpiceError, match="did not finish"):
        run_deck(DIVIDER.format(more="while 1\nlet half = 1\nend"), ["half"], timeout=1.0)


def test_a_run_that_is_asked_for_nothing_is_refused():
    with pytest.raises(SpiceError, match="proves nothing"):
        run_deck(DIVIDER.format(more=""))


def test_no_ngspice_fails_and_does_not_skip(monkeypatch):
    monkeypatch.setattr(runner.shutil, "which", lambda name: None)
    with pytest.raises(SpiceError, match="not installed"):
        run_deck(DIVIDER.format(more=""), ["half"])


def test_start_up_files_of_the_user_take_no_part(monkeypatch, tmp_path):
    (tmp_path / ".spiceinit").write_text("set numdgt=2\nquit 3\n", encoding="ascii")
    monkeypatch.setenv("HOME", str(tmp_path))
    assert run_deck(DIVIDER.format(more=""), ["half"]).numbers == {"half": 1.0}
