"""Runs the program under a pilot: keys in, what is shown out."""

import asyncio
from collections.abc import Awaitable, Callable

from textual.pilot import Pilot

from host.terminal.desk_screen import Words
from host.terminal.lines import Lines
from host.terminal.rows import texts_of
from tests.terminal.bench import Bench

Story = Callable[[Pilot[int]], Awaitable[None]]


def run(bench: Bench, story: Story, size: tuple[int, int] = (80, 24)) -> None:
    """Run a story on the program."""

    async def go() -> None:
        async with bench.app.run_test(size=size) as pilot:
            await pilot.pause()
            bench.link.sent.clear()
            await story(pilot)

    asyncio.run(go())


async def press(bench: Bench, pilot: Pilot[int], *keys: str) -> None:
    """Press keys, take the news, draw."""
    await pilot.press(*keys)
    await news(bench, pilot)


async def news(bench: Bench, pilot: Pilot[int]) -> None:
    """Take what the board said, draw."""
    bench.app.desk.poll()
    bench.app.draw()
    await pilot.pause()


def said(bench: Bench, id: str) -> str:
    """What a line of words shows."""
    return bench.app.screen.query_one(f"#{id}", Words).said


def rows(bench: Bench, id: str) -> list[str]:
    """What a panel shows."""
    return texts_of(bench.app.screen.query_one(f"#{id}", Lines).rows)
