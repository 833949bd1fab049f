"""Makes a real window with a fake worker pool, and finds things in it."""

import studies
from fake_starter import FakeRecent, FakeStarter
from PySide6.QtCore import QCoreApplication, Qt
from PySide6.QtTest import QTest

from thalweg.study.events import Finished, Iteration, Started
from thalweg_app.main import make_application
from thalweg_app.presenters.document import Recovery
from thalweg_app.presenters.jobs import RUN
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


def jobs_of(starter, function):
    return [job for job in starter.jobs if job.function == function]


def started(**changes):
    made = {
        "label": "LiH",
        "energy_unit": "hartree",
        "reference_name": "Hartree-Fock",
        "reference_energy": studies.REFERENCE,
        "exact_energy": studies.EXACT,
        "target_error": 1.6e-3,
        "n_parameters": 44,
        "n_starts": 1,
    }
    return Started(**(made | changes))


def iteration(i, energy):
    return Iteration(start=0, iteration=i, evaluations=i + 1, energy=energy, gradient_norm=0.1 / (i + 1), seconds=0.1 * i)


def finish(starter, result=None):
    job = jobs_of(starter, RUN)[-1]
    job.listener.events([started(), iteration(0, -7.86), Finished(result=result or studies.result())])
    job.listener.done(None)


def add_run(window, *errors):
    for error in errors:
        window.workbench.ledger.add(studies.result(error))


def curves(window):
    return [series.name for panel in window.picture.view.chart.panels[:1] for series in panel.series]


def press(window, key, modifier=Qt.KeyboardModifier.ControlModifier):
    QTest.keyClick(window.focusWidget() or window, key, modifier)
