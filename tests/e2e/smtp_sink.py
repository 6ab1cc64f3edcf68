"""A mail server on loopback that keeps every message with its envelope as one file.

usage: smtp_sink.py FOLDER PORT SILENT

FOLDER/001, 002, ...: one line of JSON (sender, recipients), then the message as it came. PORT 0: any free port;
the port is printed once connections are accepted. The first SILENT messages are kept but never answered for.
Ends when standard input is closed.
"""

import asyncio
import json
import os
import sys

from aiosmtpd.smtp import SMTP


class Keeper:
    def __init__(self, folder, silent):
        self.folder = folder
        self.silent = silent
        self.count = 0

    async def handle_DATA(self, server, session, envelope):
        self.count += 1
        number = self.count
        head = {"sender": envelope.mail_from, "recipients": envelope.rcpt_tos}
        name = os.path.join(self.folder, f"{number:03}")
        with open(name + ".part", "wb") as file:
            file.write(json.dumps(head).encode() + b"\n" + envelope.original_content)
        os.rename(name + ".part", name)
        if number <= self.silent:
            await asyncio.sleep(3600)
        return "250 kept"


async def serve(folder, port, silent):
    keeper = Keeper(folder, silent)
    loop = asyncio.get_running_loop()
    server = await loop.create_server(
        lambda: SMTP(keeper, hostname="loopback", enable_SMTPUTF8=True), "127.0.0.1", port
    )
    print(server.sockets[0].getsockname()[1], flush=True)
    await loop.run_in_executor(None, sys.stdin.buffer.read)
    os._exit(0)


asyncio.run(serve(sys.argv[1], int(sys.argv[2]), int(sys.argv[3])))
