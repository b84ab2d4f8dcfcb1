"""Routes, buttons and followers of a layout file: what refers to junctions, inputs and outputs."""

from typing import TYPE_CHECKING, Any

from shared_protocol import settings_table as wire
from sim.layout.keys import BUTTON_NEEDS
from sim.layout.names import Names, plain_name
from sim.layout.reading import Where, shown

if TYPE_CHECKING:
    from sim.layout.building import LayoutBuilder


def split_throw(text: str, junctions: list[str]) -> tuple[str, str]:
    """`junction: lie` as two texts; there must be a colon.

    The owner's words may hold colons too: split where the left part is a junction, else at the last one.
    """
    colons = [place for place, letter in enumerate(text) if letter == ":"]
    split = next((at for at in colons if text[:at].strip() in junctions), colons[-1])
    return text[:split].strip(), text[split + 1 :].strip()


class PanelBuilder:
    """Builds the records of routes, buttons and followers."""

    def __init__(self, builder: "LayoutBuilder") -> None:
        self._document = builder.document
        self._records = builder.records
        self._junctions = builder.junctions
        self._inputs = builder.inputs
        self._outputs = builder.outputs
        self.routes = Names(builder.document, "route")

    # ---- routes

    def read_routes(self, routes: list[dict[str, Any]]) -> None:
        """Add the records of all routes."""
        pairs: dict[tuple[int, int], str] = {}
        for number, route in enumerate(routes):
            where: Where = ("route", number)
            self.routes.add(route.get("name"), where)
            throws = self._throws(where, route.get("throws", []))
            self._entrance_and_exit(where, route, pairs)
            if not self._document.is_wrong(where):
                self._records.add(
                    wire.SET_ROUTE, where, i=number, name=plain_name(route["name"]),
                    entrance=route.get("entrance", -1), exit=route.get("exit", -1), throws=throws,
                )  # fmt: skip

    def _throws(self, where: Where, texts: list[str]) -> list[int]:
        throws: list[int] = []
        named: set[int] = set()
        for place, text in enumerate(texts):
            at: Where = (*where, "throws", place)
            junction, lie = self._throw(at, text)
            if junction in named and junction >= 0:
                self._document.wrong(at, f"the route throws '{self._junctions.names.all[junction]}' twice")
            named.add(junction)
            throws += [junction, lie]
        return throws

    def _throw(self, where: Where, text: str) -> tuple[int, int]:
        """`junction: lie` as two numbers; -1 (and noted) for what is not there."""
        if ":" not in text:
            self._document.wrong(where, f"'{shown(text)}' must be written 'junction: lie'")
            return -1, -1
        name, lie = split_throw(text, self._junctions.names.all)
        junction = self._junctions.names.find(where, name)
        return junction, self._junctions.lie_of(where, junction, lie)

    def _entrance_and_exit(self, where: Where, route: dict[str, Any], pairs: dict[tuple[int, int], str]) -> None:
        for key, other in (("entrance", "exit"), ("exit", "entrance")):
            if key in route and other not in route and not self._document.is_wrong((*where, other)):
                self._document.wrong((*where, other), f"is missing: a route with {key} needs it")
        if "entrance" in route and "exit" in route:
            pair = (route["entrance"], route["exit"])
            if pair in pairs:
                self._document.wrong((*where, "exit"), f"route '{pairs[pair]}' has the same entrance and exit")
            pairs.setdefault(pair, str(route.get("name", "")))

    # ---- buttons

    def read_buttons(self, buttons: list[dict[str, Any]]) -> None:
        """Add the records of all buttons."""
        for number, button in enumerate(buttons):
            where: Where = ("button", number)
            self._needs(where, button)
            junction = lie = other = target = -1
            if "junction" in button:
                junction = self._junctions.names.find((*where, "junction"), button["junction"])
            if "lie" in button:
                lie = self._junctions.lie_of((*where, "lie"), junction, button["lie"])
            if "other_lie" in button:
                other = self._junctions.lie_of((*where, "other_lie"), junction, button["other_lie"])
            if "route" in button:
                target = self.routes.find((*where, "route"), button["route"])
            if "number" in button:
                target = button["number"]
            source = self._inputs.find((*where, "input"), button["input"]) if "input" in button else -1
            if source >= 0:
                use = f"button {self._document.numbered('button', number)} ({button.get('kind', '')})"
                self._inputs.uses.claim(source, use, (*where, "input"))
            if not self._document.is_wrong(where) and source >= 0:
                target_key = "number" if "number" in button else "route"
                self._records.add(
                    wire.SET_BUTTON, where, {"n": target_key}, i=number, kind=button["kind"], input=source, j=junction,
                    lie=lie, other=other, n=target, read="yes" if button.get("read_at_power_up") else "no",
                )  # fmt: skip

    def _needs(self, where: Where, button: dict[str, Any]) -> None:
        """Each kind needs some keys, and has no use for the others."""
        kind = button.get("kind")
        if kind is None:
            return
        needed = BUTTON_NEEDS[kind]
        for key in needed:
            if key not in button and not self._document.is_wrong((*where, key)):
                self._document.wrong((*where, key), f"is missing: a button of kind {kind} needs it")
        allowed = {"kind", "input", "board", *needed, *(["read_at_power_up"] if kind == "switch" else [])}
        for key in button:
            if key not in allowed:
                self._document.wrong((*where, key), f"does not belong to a button of kind {kind}")

    # ---- followers

    def read_followers(self, followers: list[dict[str, Any]]) -> None:
        """Add the records of all followers."""
        for number, follower in enumerate(followers):
            where: Where = ("follower", number)
            kind = follower.get("kind", "")
            junction = lie = output = -1
            if "junction" in follower:
                junction = self._junctions.names.find((*where, "junction"), follower["junction"])
            if kind == "dead_frog" and "lie" in follower:
                self._document.wrong((*where, "lie"), "does not belong to a dead_frog: it is dead whatever the lie")
            elif "lie" in follower:
                lie = self._junctions.lie_of((*where, "lie"), junction, follower["lie"])
            elif kind in ("lamp", "frog") and not self._document.is_wrong((*where, "lie")):
                self._document.wrong((*where, "lie"), f"is missing: a {kind} needs it")
            if "output" in follower:
                output = self._outputs.find((*where, "output"), follower["output"])
            if output >= 0:
                use = f"follower {self._document.numbered('follower', number)} ({kind})"
                self._outputs.uses.claim(output, use, (*where, "output"))
            if not self._document.is_wrong(where) and output >= 0:
                self._records.add(
                    wire.SET_FOLLOWER, where, i=number, kind=kind, output=output, j=junction, lie=max(0, lie)
                )
