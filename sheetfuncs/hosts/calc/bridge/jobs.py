"""What happens when a document was loaded or saved."""

from __future__ import annotations


def on_event(context, event_name: str, model) -> None:
    """A document event: OnLoadFinished, OnSaveDone, OnSaveAsDone, OnSaveToDone."""
