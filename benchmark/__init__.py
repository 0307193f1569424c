"""Evenload: is a new switch worth it against scaled CMOS, on equal terms?

The folders are the data flow: ``sets`` (files to parameter sets) -> ``devices`` (to ``Switch`` records) ->
``circuits`` (to operation metrics) -> ``evaluate`` (over knobs) -> ``decide`` (policies, verdict) ->
``record`` -> ``report``.
"""

__version__ = "0.1.0"
