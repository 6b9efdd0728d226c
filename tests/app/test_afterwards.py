"""What is put off runs once, on the document's next turn."""

from bokeh.document import Document

from app.afterwards import Afterwards


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
    first("event")
    assert len(doc.session_callbacks) == 1
