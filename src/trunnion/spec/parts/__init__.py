"""The parts a spec is made of, as typed models with a plain (JSON) form."""

from trunnion.spec.parts.base import NamedPart, Part
from trunnion.spec.parts.conventions import Convention
from trunnion.spec.parts.envelopes import (
    Box,
    Campaign,
    Columns,
    Cone,
    Envelope,
    Phases,
    Poses,
    Product,
    Table,
)
from trunnion.spec.parts.forms import Form, PointingForm, TiltForm, VectorForm
from trunnion.spec.parts.frames import Frame
from trunnion.spec.parts.hardware import Budget, CircularPass, Gimbal, Pass, Sector, Survey, TablePass
from trunnion.spec.parts.mounts import AnglesAs, Mount, Tolerance
from trunnion.spec.parts.records import (
    Assumption,
    Calculation,
    Decision,
    Deviation,
    Document,
    Link,
    Person,
    Requirement,
    Revision,
    Source,
)
from trunnion.spec.parts.rotations import Rotation

__all__ = [
    "AnglesAs",
    "Assumption",
    "Box",
    "Budget",
    "Calculation",
    "Campaign",
    "CircularPass",
    "Columns",
    "Cone",
    "Convention",
    "Decision",
    "Deviation",
    "Document",
    "Envelope",
    "Form",
    "Frame",
    "Gimbal",
    "Link",
    "Mount",
    "NamedPart",
    "Part",
    "Pass",
    "Person",
    "Phases",
    "PointingForm",
    "Poses",
    "Product",
    "Requirement",
    "Revision",
    "Rotation",
    "Sector",
    "Source",
    "Survey",
    "Table",
    "TablePass",
    "TiltForm",
    "Tolerance",
    "VectorForm",
]
