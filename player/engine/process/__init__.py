"""A run in a process of its own: what is said over its local socket, what it shows in shared memory, both ends, its start.

A front end (terminal, window) needs three things of this room:

    start.start(body, about, rule, *arguments)   begins a run that it commands; bodies are player.commands.play_process.body and
                                                 live_process.body, each with its own `about`
    room.runs(), room.path_of(name)              this user's runs, to attach to with client.Client.at(path, commands=...)
    client.Client                                say(name, ...) of messages.ASKED, hear() of messages.TOLD, snapshot() of
                                                 layout.FIELDS; leave() detaches, `gone` says that the process is

After the pre-flight's "marks" it says "arm", then "play"; until "ended" or "failed" it shows snapshots and hears "told".
"""
