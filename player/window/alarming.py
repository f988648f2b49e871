"""What is wrong, said large over the picture; a fault blinks, once a second, and nothing else ever does."""

from player.window import words
from player.window.parted import Parted, restyle

CONFIRMS_S = 0.5
"""A vent that was asked for is seen within this time, or it is said that it is not."""


class Alarming(Parted):
    """The banner of the window."""

    def banner(self) -> tuple[str, bool]:
        """What is wrong, said large, and whether it is a fault: "" where nothing is."""
        now, on = self.now, self.link.on
        if self.is_gone:
            return words.GONE, True
        if self._unsent and on:
            return words.NOT_SENT, True
        if now is not None and on and now.state in words.MOVES and self._clock() - now.number("at_s") > words.STANDS_S:
            return words.STANDS, True
        waited = self._vented_s is not None and self._clock() - self._vented_s > CONFIRMS_S
        if waited and on and now is not None and now.state != "vented":
            return words.NOT_VENTED, True
        if self.wrong:
            # A vent that was asked for is no fault, whatever it has ended.
            return self.wrong[0], self._vented_s is None
        if now is None:
            return "", False
        boards, bad = words.boards_said(self.told.about["boards"], now.texts("link")) if self.told.about else ("", False)
        if now.state == "vented":
            asked = self._vented_s is not None
            why = "" if asked else f": {self._why_vented()}"
            return f"VENTED{why}" + (f"{':' if asked else ';'} hold A to arm and go on" if on else ""), on and not asked
        if bad and on:
            said = words.fault_said(self.told.since, self.told.about["boards"])
            return f"BOARDS: {boards}" + (f". {said}" if said else ""), True
        if now.state == "idle" and self.stage == "running" and on and not self._rested:
            said = words.why_rested(self.told.since, {*self.told.about["boards"], *self.told.about["fibers"]})
            return (f"BROUGHT TO REST: {said}; hold A to arm and go on", True) if said else ("", False)
        # What a run has gone on with, and ended all the same, is still to be seen to.
        return (words.faults_said(self.told.last[1].get("report") or {}) if self.told.last is not None else ""), False

    def _why_vented(self) -> str:
        if self.told.last is not None:
            report = self.told.last[1].get("report", {})
            return report.get("why") or "asked for elsewhere"
        return words.why_vented(self.told.since, self.told.about.get("boards", ()))

    def _show_banner(self) -> None:
        text, fault = self.banner()
        banner = self.parts.banner
        if text != banner.text() or banner.property("calm") != (not fault):
            banner.setText(text)
            banner.setAccessibleDescription(text)
            banner.setProperty("calm", not fault)
            banner.setProperty("pale", False)
            restyle(banner)
        banner.setVisible(bool(text))
        if text:
            self._place_banner()
        else:
            self.parts.hang.leave_room(0)

    def _place_banner(self) -> None:
        """Over the fibers, which leave room for it, and beside everything that is pressed: no button moves when it comes."""
        banner, room = self.parts.banner, self.parts.middle.geometry()
        width = max(200, room.width() - self.parts.column.width() - 24)
        banner.setGeometry(room.left() + 8, room.top() + 4, width, banner.heightForWidth(width))
        banner.raise_()
        self.parts.hang.leave_room(banner.height() + 8)

    def _blinked(self) -> None:
        """A fault blinks, once a second; nothing else ever does."""
        banner = self.parts.banner
        if banner.isVisible() and not banner.property("calm"):
            banner.setProperty("pale", not banner.property("pale"))
            restyle(banner)
