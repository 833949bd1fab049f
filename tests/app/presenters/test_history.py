from thalweg_app.presenters.history import History


def edit(history, store, old, new):
    store[0] = new
    history.record(f"to {new}", lambda: store.__setitem__(0, old), lambda: store.__setitem__(0, new))


def test_undo_and_redo_walk_through_every_edit():
    history, store = History(), ["a"]
    edit(history, store, "a", "b")
    edit(history, store, "b", "c")
    history.undo()
    history.undo()
    assert store == ["a"]
    history.redo()
    assert (store, history.undo_text, history.redo_text) == (["b"], "to b", "to c")


def test_a_new_edit_forgets_what_was_undone():
    history, store = History(), ["a"]
    edit(history, store, "a", "b")
    history.undo()
    edit(history, store, "a", "x")
    history.redo()
    assert store == ["x"]
    assert history.redo_text == ""


def test_undo_with_nothing_to_undo_does_nothing():
    history = History()
    history.undo()
    history.redo()
    assert history.undo_text == history.redo_text == ""
