"""The questions that the service answers, one file for each capability."""

from service.question import Question
from service.routes import (
    angular,
    catalogue,
    components,
    features,
    field,
    insensitive,
    profile,
    shift,
    strengths,
    sublevels,
    sweep,
)

QUESTIONS: tuple[Question, ...] = (
    *catalogue.QUESTIONS,
    shift.QUESTION,
    sublevels.QUESTION,
    components.QUESTION,
    strengths.QUESTION,
    insensitive.QUESTION,
    field.QUESTION,
    sweep.QUESTION,
    features.QUESTION,
    profile.QUESTION,
    *angular.QUESTIONS,
)
