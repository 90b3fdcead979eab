"""Tables of working."""

from __future__ import annotations

from crosscheck.answer import WorkTable
from crosscheck.frame.kinematics import Study
from crosscheck.frame.model import Frame


def working(frame: Frame, study: Study, name: str) -> list[WorkTable]:
    return []
