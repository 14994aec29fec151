"""A kernel websocket that sends at once.

Small messages wait about 50 ms when the sender gathers them (Nagle's algorithm) and the receiver
delays its acknowledgement; a slider feels every one of them. The ``haarloom`` command names this
class to the one server that it starts.
"""

from __future__ import annotations

from typing import Any

from jupyter_server.services.kernels.connection.channels import ZMQChannelsWebsocketConnection

__all__ = ["PromptConnection"]


class PromptConnection(ZMQChannelsWebsocketConnection):
    """The server's own connection with TCP_NODELAY set."""

    def connect(self) -> Any:
        """Connect as ever, with nothing held back."""
        self.websocket_handler.set_nodelay(True)
        return super().connect()
