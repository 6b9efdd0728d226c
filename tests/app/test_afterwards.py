"""What is put off runs once, and not too often."""

from bokeh.document import Document

from app.afterwards import EVERY_MS, Afterwards


def test_many_events_are_shown_once_and_in_order():
    doc = Document()
    afterwards = Afterwards(doc)
    seen = []
    first = afterwards.put_off(lambda: seen.append("first"))
    second = afterwards.put_off(lambda: seen.append("second"))
    for watcher in (first, second, first, first):
        watcher("event")
    assert seen == []
    (waiting,) = doc.session_callbacks
    waiting.callback()
    assert seen == ["first", "second"]
    first("event")  # soon again: it waits until some time has passed
    assert doc.session_callbacks[-1].timeout > EVERY_MS / 2
