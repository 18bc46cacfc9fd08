"""The prompt through a pseudo-terminal: history, completion, continuation lines, Ctrl-C, Ctrl-D, progress, colour.
usage: run_prompt.py BUILD"""
import os
import pty
import re
import select
import shutil
import signal
import sys
import tempfile
import time

here = os.path.dirname(os.path.dirname(os.path.abspath(__file__)))
program = os.path.join(here, sys.argv[1] if len(sys.argv) > 1 else "build", "termwise")
passed = failed = 0


class Terminal:
    def __init__(self, state, *options, **more):
        self.folder = tempfile.mkdtemp()
        self.seen = ""
        env = dict(os.environ, XDG_STATE_HOME=state, TERM="xterm", TW_STDLIB=os.path.join(here, "stdlib"), INPUTRC="/dev/null",
                   LC_ALL="C.UTF-8")
        env.pop("NO_COLOR", None)
        env.update(more)
        self.pid, self.fd = pty.fork()
        if self.pid == 0:
            os.chdir(self.folder)
            os.execve(program, [program, *options], env)

    def read(self, pattern, seconds=20):
        """Reads until the pattern stands in what has come since the last success; that text, or None."""
        end = time.time() + seconds
        while not re.search(pattern, self.seen):
            ready = select.select([self.fd], [], [], max(0, end - time.time()))[0]
            if not ready:
                return None
            try:
                piece = os.read(self.fd, 65536)
            except OSError:
                piece = b""
            if not piece:
                return None
            self.seen += piece.decode("utf-8", "replace")
        m = re.search(pattern, self.seen)
        text, self.seen = self.seen[: m.end()], self.seen[m.end():]
        return text

    def type(self, keys):
        os.write(self.fd, keys.encode())

    def status(self, seconds=20):
        """Exit status, None when it does not end."""
        end = time.time() + seconds
        while time.time() < end:
            if select.select([self.fd], [], [], 0.05)[0]:
                try:
                    self.seen += os.read(self.fd, 65536).decode("utf-8", "replace")
                except OSError:
                    pass
            pid, status = os.waitpid(self.pid, os.WNOHANG)
            if pid:
                self.close()
                return os.waitstatus_to_exitcode(status)
        os.kill(self.pid, signal.SIGKILL)
        os.waitpid(self.pid, 0)
        self.close()
        return None

    def close(self):
        os.close(self.fd)
        shutil.rmtree(self.folder, ignore_errors=True)


def check(good, words, terminal=None):
    global passed, failed
    passed += bool(good)
    failed += not good
    if not good:
        print("FAILED:", words)
        if terminal:
            print("  seen:", repr(terminal.seen[-600:]))


PROMPT = r"tw> "
state = tempfile.mkdtemp()
history = os.path.join(state, "termwise", "history")

t = Terminal(state)
check(t.read(PROMPT), "the prompt comes", t)
t.type("let ramp = 1 + x\r")
check(t.read(r"ramp = (?s:.*)" + PROMPT), "a definition answers, the prompt comes back", t)
t.type("let g = (1 +\r")
check(t.read(r"\.\.\. "), "an open bracket asks for another line with another prompt", t)
t.type("y)\r")
check(t.read(r"g = (?s:.*)" + PROMPT), "the continued statement runs", t)
t.type("let h = (1 +\r")
t.read(r"\.\.\. ")
t.type("\x03")
check(t.read(r"\^C\r?\n.*" + PROMPT), "Ctrl-C on a continuation line forgets the statement", t)
t.type("show h\r")
check(t.read(r"error:(?s:.*)`h`(?s:.*)" + PROMPT), "the forgotten statement has not run", t)
t.type("let wrong\x03")
check(t.read(r"\^C\r?\n.*" + PROMPT), "Ctrl-C on a line being typed cancels it", t)
t.type("show ra\t\r")
check(t.read(r"show ramp ?\r?\n(?s:.*)ramp = (?s:.*)" + PROMPT), "a name of the user is completed", t)
t.type("coeffi\t")
check(t.read(r"coefficients "), "a word of the language is completed", t)
t.type("\x03")
t.read(PROMPT)
t.type("let k = lnGa\t")
check(t.read(r"lnGamma\("), "a function is completed with its bracket", t)
t.type("3)\r")
t.read(r"k = (?s:.*)" + PROMPT)
open(os.path.join(t.folder, "prepared_rules.tw"), "w").write("let from_file = 7\n")
t.type('use "prep\t')
check(t.read(r'prepared_rules\.tw"'), "a file name is completed within quotes", t)
t.type("\r")
t.read(PROMPT)
t.type("show from_file\r")
check(t.read(r"from_file = 7(?s:.*)" + PROMPT), "the completed file was used", t)
t.type("\x1b[200~let p1 = 11\nlet p2 = 12\n\x1b[201~\r")
check(t.read(r"p1 = 11(?s:.*)p2 = 12(?s:.*)" + PROMPT), "pasted lines run one after the other", t)
t.type("bad bad\r")
check(t.read(r"\x1b\[1;31merror:\x1b\[0m"), "an error is red at a terminal", t)
t.read(PROMPT)
t.type("\x04")
check(t.status() == 0, "Ctrl-D quits with status 0", t)

check(os.path.exists(history), "the history file is in the state folder")
kept = open(history, encoding="utf-8").read() if os.path.exists(history) else ""
check("let ramp = 1 + x\n" in kept, "the history holds what was typed")
check("let g = (1 + y)\n" in kept, "a statement of several lines is one entry of the history")

t = Terminal(state, NO_COLOR="1")
t.read(PROMPT)
t.type("\x1b[A")
check(t.read(r"bad bad"), "the last line of the run before comes back with the up key", t)
t.type("\r")
check("\x1b[1;31m" not in (t.read(r"error:(?s:.*)" + PROMPT) or "\x1b[1;31m"), "no colour with NO_COLOR", t)
t.type("quit\r")
check(t.status() == 0, "quit ends with status 0", t)

t = Terminal(state)
t.read(PROMPT)
t.type("let kept = 5\r")
t.read(r"kept = 5(?s:.*)" + PROMPT)
t.type("evaluate sum from k = 1 to 20000 of sum from j = 1 to 20000 of 1/(j + k)\r")
check(t.read(r"\x1b\[Kevaluate[^\r]*\.\.\. [0-9]+ s", 15), "long work says what it does", t)
t.type("\x03")
check(t.read(r"interrupted(?s:.*)" + PROMPT), "Ctrl-C stops the running request and shows the prompt again", t)
t.type("show kept\r")
check(t.read(r"kept = 5(?s:.*)" + PROMPT), "the session is kept after Ctrl-C", t)
t.type("\x04")
check(t.status() == 0, "status 0 after an interrupted request at the prompt", t)

unwritable = os.path.join(state, "plain")
open(unwritable, "w").close()
t = Terminal(unwritable)
t.read(PROMPT)
t.type("let q = 3\r")
check(t.read(r"q = 3(?s:.*)" + PROMPT), "a state folder that cannot be made does no harm", t)
t.type("\x04")
check(t.status() == 0, "and the end is clean", t)
shutil.rmtree(state)
print("%d passed, %d failed, 0 skipped" % (passed, failed))
sys.exit(failed != 0)
