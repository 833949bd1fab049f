"""Makes a real window with a fake worker pool, and finds things in it."""

from fake_starter import FakeRecent, FakeStarter
from PySide6.QtCore import QCoreApplication, Qt

from thalweg_app.main import make_application
from thalweg_app.presenters.document import Recovery
from thalweg_app.presenters.workbench import Workbench
from thalweg_app.theme import Theme
from thalweg_app.views.window import Window


def theme():
    """One theme for all windows of a test run, as in the program."""
    QCoreApplication.setAttribute(Qt.ApplicationAttribute.AA_DontUseNativeDialogs)
    application = make_application()
    if not hasattr(application, "kept_theme"):
        application.kept_theme = Theme(application)
    return application.kept_theme


def make(qtbot, folder, starter=None, **jobs):
    made = Window(Workbench(starter or FakeStarter(), FakeRecent(), **jobs), theme(), Recovery(folder / "recovery"))
    qtbot.addWidget(made)
    made._may_close = True  # tests that close on purpose set it back
    made.show()
    qtbot.waitExposed(made)
    made.activateWindow()
    return made


def dialog(window, kind):
    """The visible dialog of this class."""
    return next((d for d in window.findChildren(kind) if d.isVisible()), None)
