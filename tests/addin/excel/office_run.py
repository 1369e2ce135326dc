"""Runs Basic modules in LibreOffice and tells what they answer.

To be run by a Python that has ``uno`` (the system's own), in a process of its
own: ``office_run.py JOB ANSWERS``. The job is JSON: ``modules`` (name -> text),
``cells`` (address -> value or formula), ``calls`` (names of functions without
arguments that give text) and ``read`` (addresses). The office has a private
profile and is ended, with all that it started, whatever happens.
"""

import json
import os
import shutil
import signal
import subprocess
import sys
import tempfile
import threading
import time
from typing import Any

import uno
from com.sun.star.beans import PropertyValue

START_WITHIN = 90
END_WITHIN = 240


def _property(name: str, value: Any) -> Any:
    made = PropertyValue()
    made.Name, made.Value = name, value
    return made


def _connect(pipe: str) -> Any:
    local = uno.getComponentContext()
    resolver = local.ServiceManager.createInstanceWithContext("com.sun.star.bridge.UnoUrlResolver", local)
    last = time.monotonic() + START_WITHIN
    while True:
        try:
            return resolver.resolve(f"uno:pipe,name={pipe};urp;StarOffice.ComponentContext")
        except Exception:
            if time.monotonic() > last:
                raise
            time.sleep(0.3)


def _work(context: Any, job: dict[str, Any]) -> dict[str, Any]:
    desktop = context.ServiceManager.createInstanceWithContext("com.sun.star.frame.Desktop", context)
    hidden = (_property("Hidden", True), _property("MacroExecutionMode", 4))
    document = desktop.loadComponentFromURL("private:factory/scalc", "_blank", 0, hidden)
    libraries = document.BasicLibraries
    libraries.VBACompatibilityMode = True
    if not libraries.hasByName("Standard"):
        libraries.createLibrary("Standard")
    library = libraries.getByName("Standard")
    for name, text in job["modules"].items():
        library.insertByName(name, text)
    sheet = document.Sheets.getByIndex(0)
    for address, value in job["cells"].items():
        cell = sheet.getCellRangeByName(address)
        if isinstance(value, str) and value.startswith("{"):
            cell.setArrayFormula(value[1:-1])
        elif isinstance(value, str):
            cell.setFormula(value)
        else:
            cell.setValue(value)
    shown = {a: sheet.getCellRangeByName(a).getString() for a in job["read"]}
    provider = document.getScriptProvider()
    answers = []
    for name in job["calls"]:
        address = f"vnd.sun.star.script:Standard.{name}?language=Basic&location=document"
        try:
            answers.append(provider.getScript(address).invoke((), (), ())[0])
        except Exception as error:
            answers.append(f"FAULT {error}")
    document.close(True)
    return {"answers": answers, "shown": shown}


def main() -> None:
    job_file, answer_file = sys.argv[1:]
    with open(job_file, encoding="utf-8") as source:
        job = json.load(source)
    office = shutil.which("soffice") or shutil.which("libreoffice")
    if office is None:
        sys.exit("LibreOffice was not found")
    profile = tempfile.mkdtemp(prefix="thrustbook-office-")
    pipe = f"thrustbook{os.getpid()}"
    process = subprocess.Popen(
        [
            office,
            f"-env:UserInstallation=file://{profile}",
            "--headless",
            "--norestore",
            "--nologo",
            "--nodefault",
            f"--accept=pipe,name={pipe};urp;StarOffice.ComponentContext",
        ],
        stdin=subprocess.DEVNULL,
        stdout=subprocess.DEVNULL,
        stderr=subprocess.DEVNULL,
        start_new_session=True,
    )
    # A Basic program that never ends would leave the bridge waiting for ever.
    watch = threading.Timer(job.get("within", END_WITHIN), os.killpg, (process.pid, signal.SIGKILL))
    watch.start()
    try:
        answers = _work(_connect(pipe), job)
    finally:
        watch.cancel()
        if process.poll() is None:
            os.killpg(process.pid, signal.SIGKILL)
        process.wait()
        shutil.rmtree(profile, ignore_errors=True)
    with open(answer_file, "w", encoding="utf-8") as target:
        json.dump(answers, target)


if __name__ == "__main__":
    main()
