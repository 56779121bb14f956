"""Every table; each module holds those of one thing."""

from webapp.models.base import Base, UtcDateTime, new_id, now
from webapp.models.bottle import Bottle, HandOver, LabResult
from webapp.models.invitation import Invitation, PhoneSession
from webapp.models.meter import Meter, MeterCheck, MeterCheckEvent
from webapp.models.reading import Reading, ReadingEvent
from webapp.models.survey import (
    Decision,
    History,
    Person,
    PlanVersion,
    Seen,
    SettingsVersion,
    Station,
    Survey,
    SurveyMember,
)
from webapp.models.version import FrozenDataset, SurveyEvent
from webapp.models.visit import Visit, VisitEntry

__all__ = [
    "Base", "Bottle", "Decision", "FrozenDataset", "HandOver", "History", "Invitation", "LabResult", "Meter",
    "MeterCheck", "MeterCheckEvent", "Person", "PhoneSession", "PlanVersion", "Reading", "ReadingEvent", "Seen",
    "SettingsVersion", "Station", "Survey", "SurveyEvent", "SurveyMember", "UtcDateTime", "Visit", "VisitEntry",
    "new_id", "now",
]  # fmt: skip
