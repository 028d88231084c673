"""Whether the model is right, in words: what a hammer test says of the chosen mode, and what is wrong in the test."""

from __future__ import annotations

from viewer.insight.pair_words import pair_sentence
from viewer.insight.wrong_channels import Faults
from viewer.session.pictures import test_of
from viewer.session.project import Project, Tested
from viewer.session.state import State

LOOKING = "looking …"
ACCEPT = "Put right: write into the dossier"
TAKE_BACK = "Take the corrections back"


def model_words(project: Project, state: State) -> tuple[str, bool, str]:
    """The answer, whether it is known, and what can be done about it (one of the words above, or empty)."""
    energies = _energies(project, state)
    name = test_of(project, state)
    if not name:
        return f"{energies}{_untested(project, state)}", False, ""
    found = project.tests.get(name)
    if not isinstance(found, Tested):
        return f"{energies}{LOOKING if found is None else found}", False, ""
    said = [energies.strip(), _pair(found, state), *_corrected(found), *_faults(found)]
    return " ".join(words for words in said if words), True, _offer(found)


def _energies(project: Project, state: State) -> str:
    """Whether an imported mode is in balance with the energies computed for it."""
    study = project.studies[state.design]
    figures = study.figures
    if figures is None or study.modes.origin != "imported":
        return ""
    index = state.mode - 1
    closure, trusted = float(figures.closure[index]), bool(figures.trusted[index])
    if closure != closure:
        return ""
    verdict = "the energies are trusted" if trusted else "the energies are not trusted"
    return f"From its own energies the frequency comes out {closure:.2f} times that given: {verdict}. "


def _untested(project: Project, state: State) -> str:
    others = [plan for plan in project.opened.dossier.tests if plan.design != state.design]
    if not others:
        return "Not tested: add a hammer test to the dossier ([[tests]] with name and file)."
    return f"This design is not tested; test {others[0].name} is of {others[0].design}."


def _pair(found: Tested, state: State) -> str:
    mine = next((p for p in found.correlation.pairs if p.analysis == state.mode), None)
    return "" if mine is None else f"Test {found.found.name}: {_low(pair_sentence(mine.to_dict()))}"


def _low(sentence: str) -> str:
    return sentence[:1].lower() + sentence[1:]


def _corrected(found: Tested) -> list[str]:
    said = found.found.corrected
    return [f"Put right in the test: {'; '.join(said)}."] if said else []


def _faults(found: Tested) -> list[str]:
    if not isinstance(found.faults, Faults) or not found.faults.proposals:
        return []
    certain = [p.words for p in found.faults.proposals if p.certain]
    open_ = [p.words for p in found.faults.proposals if not p.certain]
    said = [f"Seems wrong in the test: {'; '.join(certain)}."] if certain else []
    return said + ([f"Perhaps wrong, or another channel: {'; '.join(open_)}."] if open_ else [])


def _offer(found: Tested) -> str:
    if isinstance(found.faults, Faults) and found.faults.corrections:
        return ACCEPT
    return TAKE_BACK if found.found.plan.corrections else ""
