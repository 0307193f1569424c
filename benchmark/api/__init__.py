"""Python use, from scripts and notebooks (between report and cli): the numbers of the command line, to the last digit.

>>> from benchmark import api
>>> study = api.worked_study("always-on-hub")
>>> study.title
'Is an invented stress-gated switch worth it in an always-on hub?'

``load_study`` checks a study and everything it refers to, ``run`` returns a ``Result`` with the verdict, the tables as
pandas frames and the complete record, ``what_if`` changes numbers without a new file. ``load_set`` shows one parameter
set, ``technologies`` lists them, ``check`` judges files. ``need``, ``trade``, ``sheet``, ``joint_sheet``,
``opportunity``, ``improve`` and ``flips`` say where the answer would change, ``changes`` what changed between two
states and why, ``batch`` which studies of a folder moved. ``supersede`` gives a value of a set a new number and keeps
the old one; ``extract`` reads numbers off measured curves.
Objects show themselves as tables in a notebook.

Importing this module loads no numeric package; the functions do.
"""

from __future__ import annotations

from benchmark.api.batch import Batched, batch
from benchmark.api.changes import Changes, changes
from benchmark.api.edit import Edited, export_sheet, import_sheet, supersede
from benchmark.api.extract import Extraction, extract
from benchmark.api.need import Needed, flips, improve, joint_sheet, need, opportunity, sheet, trade
from benchmark.api.result import Result
from benchmark.api.session import check, load_result, load_set, load_study, run, technologies, what_if, worked_study
from benchmark.api.views import SetView, StudyView

__all__ = [
    "Batched",
    "Changes",
    "Edited",
    "Extraction",
    "Needed",
    "Result",
    "SetView",
    "StudyView",
    "batch",
    "changes",
    "check",
    "export_sheet",
    "extract",
    "flips",
    "import_sheet",
    "improve",
    "joint_sheet",
    "load_result",
    "load_set",
    "load_study",
    "need",
    "opportunity",
    "run",
    "sheet",
    "supersede",
    "technologies",
    "trade",
    "what_if",
    "worked_study",
]
