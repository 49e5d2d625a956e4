"""The questions that the service answers, one file for each capability."""

from service.question import Question
from service.routes import (
    angular,
    catalogue,
    components,
    features,
    field,
    finding,
    insensitive,
    profile,
    shift,
    strengths,
    sublevels,
    sweep,
)

QUESTIONS: tuple[Question, ...] = (
    shift.QUESTION,  # routes are tried in this order: what control software asks all day comes first
    sublevels.QUESTION,
    components.QUESTION,
    strengths.QUESTION,
    insensitive.QUESTION,
    field.QUESTION,
    sweep.QUESTION,
    features.QUESTION,
    profile.QUESTION,
    *angular.QUESTIONS,
    *catalogue.QUESTIONS,
    *finding.QUESTIONS,
)
