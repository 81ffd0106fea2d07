"""Handing over: outputs written, and copies of the survey folder, beside the window and with progress."""

from __future__ import annotations

from contextlib import suppress
from datetime import datetime
from pathlib import Path

from PySide6.QtCore import QObject

from plumbwell.desk.document import Document
from plumbwell.desk.frame.notice import Notice
from plumbwell.desk.frame.status_line import StatusLine
from plumbwell.desk.jobs import Stopped
from plumbwell.desk.workspace import Workspace
from plumbwell.files.output_folder import check_target
from plumbwell.plates.numbers import counted
from plumbwell.plates.outputs import Written, write_outputs
from plumbwell.survey.errors import PlumbwellError

AT_WORK = "Files are being written already; wait for them, or stop that first."


class HandingOver(QObject):
    """What the Handover stage does.

    Parameters
    ----------
    document : Document
    work : Workspace
    status : StatusLine
    notice : Notice
    """

    def __init__(self, document: Document, work: Workspace, status: StatusLine, notice: Notice) -> None:
        super().__init__(document)
        self._document, self._work, self._status, self._notice = document, work, status, notice
        work.handover.write_wanted.connect(self.write)
        work.handover.copy_wanted.connect(self.copy)
        document.done.connect(self._done)
        document.not_done.connect(self._not_done)

    def write(self, folder: str) -> None:
        """Write the outputs of the present result into a folder."""
        results, panel = self._document.results, self._work.handover
        if not folder or results is None:
            panel.say("Name a folder for the outputs.", wrong=True)
            return
        document = self._document
        if document.at_work:
            panel.say(AT_WORK, wrong=True)
            return
        if not document.current:
            panel.say(
                "A result is on its way; write when it is there."
                if document.busy
                else "There is no result of the survey as it stands now, so nothing is written. Undo what was done "
                "last, or mend it; then write.",
                wrong=True,
            )
            return
        try:
            target = check_target(self._beside(folder), survey=self._document.folder)
        except PlumbwellError as error:
            panel.say(str(error), wrong=True)
            return
        panel.say("Writing.")
        self._status.set_progress(0.0, "writing the outputs")
        self._document.long_work(lambda progress: write_outputs(results, target, progress=progress))

    def _beside(self, folder: str) -> Path:
        """The folder that was named: one without a place of its own lies beside the survey folder."""
        survey = self._document.folder
        with suppress(RuntimeError):  # "~" where nobody has a home
            folder = str(Path(folder).expanduser())
        return Path(folder) if survey is None else survey.parent / folder

    def copy(self, folder: str) -> None:
        """Write a copy of the survey folder with all acts in it."""
        case, source = self._document.case, self._document.folder
        if case is None or source is None:
            return
        if self._document.at_work:
            self._work.handover.say(AT_WORK, wrong=True)
            return
        target = self._beside(folder)

        def copy(progress: object) -> Path:
            # Loaded when it is wanted: its library costs a start more than all the rest of handing over.
            from plumbwell.files.survey_copy import write_survey_copy

            write_survey_copy(case, source, target)
            return target

        self._status.set_progress(0.0, "writing a copy of the survey folder")
        self._document.long_work(copy)

    def _done(self, value: object) -> None:
        self._status.set_progress(None, "")
        panel = self._work.handover
        if isinstance(value, Written):
            when = datetime.now().strftime("%H:%M")
            present = self._document.results
            if present is not None and value.results.readings is present.readings:
                self._work.set_written(value.names, f"written {when}")
            notes = [note[:1].upper() + note[1:] for note in value.notes]
            words = f"{counted(len(value.names), 'file')} written {when} into {value.folder}"
            panel.say(". ".join([words, *notes]) + ".", written=value.folder)
        elif isinstance(value, Path):
            words = f"A copy of the survey folder is in {value}."
            panel.say(words, written=value)
            self._notice.say(words)

    def _not_done(self, error: BaseException) -> None:
        self._status.set_progress(None, "")
        if isinstance(error, Stopped):
            words = "Stopped. Nothing was written."
        elif isinstance(error, OSError):
            where = f"{error.filename}: " if error.filename else ""
            words = (
                f"The files could not be written: {where}{error.strerror or type(error).__name__}. What stood there "
                "before is unchanged; name another folder, or make room and write again."
            )
        elif isinstance(error, PlumbwellError):
            words = str(error)
        else:
            words = "A fault of the program stopped the writing. What stood there before is unchanged."
        self._work.handover.say(words, wrong=True)
        self._notice.say(words, wrong=True)
