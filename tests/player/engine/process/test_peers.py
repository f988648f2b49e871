"""Whose the other end of a socket is, as the system says."""

import os
import socket

import pytest

from player.engine.process.client import Client
from player.engine.process.peers import Stranger, check_peer, name_of, peer_uid


def test_the_system_says_whose_the_other_end_is():
    one, other = socket.socketpair()
    assert peer_uid(one) == os.geteuid()
    check_peer(one)
    one.close(), other.close()


def test_another_users_run_is_refused_with_a_sentence(monkeypatch):
    from player.engine.process import peers

    monkeypatch.setattr(peers, "peer_uid", lambda connection: os.geteuid() + 12345)
    one, other = socket.socketpair()
    with pytest.raises(Stranger, match="belongs to another user"):
        Client(one, commands=True)
    assert other.recv(100) == b""
    other.close()


def test_a_user_without_a_name_is_a_number():
    assert name_of(987654) == "number 987654"


def test_a_run_in_a_folder_that_is_shut_to_this_user_is_another_ones(monkeypatch):
    class Shut(socket.socket):
        def connect(self, path):
            raise PermissionError(13, "Permission denied")

    monkeypatch.setattr("player.engine.process.client.socket.socket", Shut)
    with pytest.raises(Stranger, match="belongs to another user: only they may attach to it"):
        Client.at("/run/user/4242/drawcord/bench-1.run", commands=False)
