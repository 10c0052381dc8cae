"""The command palette, which must not fall over in a terminal too small to list anything."""

from __future__ import annotations

from textual.command import CommandList, CommandPalette


class Palette(CommandPalette):
    """Keys that move in the list wait until it has a line to stand on."""

    def _action_command_list(self, action: str) -> None:
        if self.query_one(CommandList).scrollable_content_region.height > 0:
            super()._action_command_list(action)
