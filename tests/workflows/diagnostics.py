"""What the Nextflow language server says about a folder of scripts and configurations.

    from diagnostics import diagnose
    {file: [(severity, line, message), ...]}      severity 1 is an error; a file that got no answer is not in it
"""

import json
import queue
import subprocess
import threading
import time

QUIET_SECONDS = 3
LONGEST_SECONDS = 60


class Server:
    """The server as a child process that speaks JSON-RPC over its standard streams."""

    def __init__(self, jar):
        self.child = subprocess.Popen(
            ["java", "-jar", str(jar)], stdin=subprocess.PIPE, stdout=subprocess.PIPE, stderr=subprocess.DEVNULL
        )
        self.inbox = queue.Queue()
        self.said = {}
        threading.Thread(target=self._listen, daemon=True).start()

    def _listen(self):
        while message := self._read():
            self.inbox.put(message)

    def _read(self):
        length = None
        while line := self.child.stdout.readline().strip():
            name, _, value = line.partition(b":")
            if name.lower() == b"content-length":
                length = int(value)
        return None if length is None else json.loads(self.child.stdout.read(length))

    def send(self, method, params, **more):
        self._write({"method": method, "params": params, **more})

    def _write(self, message):
        body = json.dumps({"jsonrpc": "2.0", **message}).encode()
        self.child.stdin.write(b"Content-Length: %d\r\n\r\n" % len(body) + body)
        self.child.stdin.flush()

    def wait(self, done):
        """Takes messages until `done(message)`, called with None after a quiet while."""
        end, heard = time.monotonic() + LONGEST_SECONDS, time.monotonic()
        while time.monotonic() < end:
            try:
                message = self.inbox.get(timeout=0.2)
            except queue.Empty:
                if time.monotonic() - heard > QUIET_SECONDS and done(None):
                    return
                continue
            heard = time.monotonic()
            if message.get("method") == "textDocument/publishDiagnostics":
                self.said[message["params"]["uri"].replace("file:///", "file:/")] = message["params"]["diagnostics"]
            elif "id" in message and "method" in message:
                # A question of the server: it has no settings from us but the ones sent to it.
                settings = message["method"] == "workspace/configuration"
                self._write({"id": message["id"], "result": [{}] if settings else None})
            if done(message):
                return
        raise TimeoutError(f"the language server did not end within {LONGEST_SECONDS} s")

    def stop(self):
        self.child.kill()
        self.child.wait()


def diagnose(jar, folder):
    folder = folder.resolve()
    files = sorted([*folder.rglob("*.nf"), *folder.rglob("*.config")])
    server = Server(jar)
    try:
        place = {"uri": folder.as_uri(), "name": folder.name}
        abilities = {"workspace": {"workspaceFolders": True}, "textDocument": {"publishDiagnostics": {}}}
        hello = {"processId": None, "rootUri": place["uri"], "capabilities": abilities, "workspaceFolders": [place]}
        server.send("initialize", hello, id=1)
        server.wait(lambda message: message is not None and message.get("id") == 1)
        server.send("initialized", {})
        nextflow = {"errorReportingMode": "paranoid", "debug": False, "files": {"exclude": [".git"]}}
        server.send("workspace/didChangeConfiguration", {"settings": {"nextflow": nextflow}})
        server.wait(lambda message: message is None)
        for file in files:
            kind = "nextflow-config" if file.suffix == ".config" else "nextflow"
            document = {"uri": file.as_uri(), "languageId": kind, "version": 1, "text": file.read_text()}
            server.send("textDocument/didOpen", {"textDocument": document})
        # Each file gets an answer, if only an empty one; on a busy machine it may take its time. Later ones may mend it.
        server.wait(lambda _: len(server.said) >= len(files))
        server.wait(lambda message: message is None)
    except TimeoutError as late:
        print(f"the language server fell silent: {late}")
    finally:
        server.stop()
    answers = ((file, server.said.get(file.as_uri().replace("file:///", "file:/"))) for file in files)
    return {
        file.relative_to(folder): [(d.get("severity", 1), d["range"]["start"]["line"] + 1, d["message"]) for d in found]
        for file, found in answers
        if found is not None
    }
