# The worked study from Python. Open it in an editor that runs cells (`# %%`), or run it whole; a test does.

# %% [markdown]
# # Is an invented stress-gated switch worth it in an always-on hub?
# The question, policy and thresholds are in `study.toml` beside this file; here it is asked from Python, with the
# numbers of the command line to the last digit. Every number of the candidate is invented.

# %%
import altair
import pandas

from benchmark import api

study = api.worked_study("always-on-hub")  # one of your own: api.load_study("my-study.toml")
study

# %% [markdown]
# ## What goes in
# Every value of a set with its unit, range, evidence and source; the same as a frame.

# %%
candidate = study.sets["demo-stress-gated"]
candidate

# %%
resistances = candidate.frame.query("name.str.startswith('resistance')")
resistances[["name", "value", "unit", "value_SI", "evidence", "source"]]

# %% [markdown]
# ## The answer
# A result shows its verdict, reasons, design points and requirements; `result.text` is what a terminal prints.

# %%
result = api.run(study)
result

# %% [markdown]
# ## Tables
# The tables of the record folder as frames. Units stand in the column names and in `attrs`; where there is no number, a
# cell holds a word that says why, so numbers are taken out explicitly.

# %%
curves = result.frames["curves"]
curves.attrs["units"]

# %%
feasible = curves[curves["state"] == "feasible"]
cheapest = feasible.loc[
    feasible.assign(energy=pandas.to_numeric(feasible["energy_J"])).groupby("side")["energy"].idxmin()
]
cheapest[["side", "supply_V", "time_s", "energy_J", "delay_limit", "energy_limit"]]

# %%
chart = (
    altair.Chart(feasible[["side", "time_s", "energy_J"]].astype({"time_s": float, "energy_J": float}))
    .mark_line()
    .encode(
        altair.X("time_s", title="time (s)").scale(type="log"),
        altair.Y("energy_J", title="energy per operation (J)").scale(type="log"),
        altair.Color("side"),
    )
)
chart

# %% [markdown]
# ## Which inputs move the answer
# Each input alone over its stated range; the widest swing comes first.

# %%
moves = result.frames["moves"]
moves.head(8)[["input", "best", "low", "high", "unit", "advantage_at_low", "advantage_at_high", "decisive"]]

# %% [markdown]
# ## What if
# A what-if is a study of its own: checked, recorded, and the first one stays as it is. Here the block is awake for
# longer (`--set` on the command line). A lower resistance of the closed channel needs the name of its set:
# `api.what_if(study, {"demo-stress-gated.resistance_floor": 2.0e4})`.

# %%
busier = api.what_if(study, active_cycles=200000)
answers = pandas.DataFrame(
    {"active_cycles": name, "verdict": found.verdict, "advantage": found.advantage}
    for name, found in (("as stated", result), ("200 000", api.run(busier)))
)
answers

# %% [markdown]
# ## Keep it
# `result.save("my-record")` writes the record folder, `result.report("report.html")` the page alone, and
# `api.load_result("my-record")` reads a record back.
