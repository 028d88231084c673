"""What the window shows, without a window: a frozen state, pure actions on it, and what is known of a dossier."""

from viewer.session.history import History
from viewer.session.project import Project
from viewer.session.session import Session
from viewer.session.state import Band, State

__all__ = ["Band", "History", "Project", "Session", "State"]
