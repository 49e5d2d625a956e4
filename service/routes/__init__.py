"""The questions that the service answers, one file for each capability."""

from service.question import Question
from service.routes import (
    angular,
    book,
    catalogue,
    components,
    features,
    field,
    insensitive,
    profile,
    repump,
    search,
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
    repump.QUESTION,
    *angular.QUESTIONS,
    *catalogue.QUESTIONS,
    *search.QUESTIONS,
    book.QUESTION,
)
