"""Type into cells of a workbook the way a user does, in LibreOffice Calc; run by test_calc.py.

Arguments: workbook, copy to save, filter of the copy, and cells as JSON: [sheet, address, text].
Runs under the Python that LibreOffice's own module ``uno`` is installed for.
"""

import json
import subprocess
import sys
import tempfile
import time
from pathlib import Path

import uno
from com.sun.star.beans import PropertyValue
from com.sun.star.connection import NoConnectException

PIPE = f"typing{time.time_ns()}"


def option(name: str, value: object) -> PropertyValue:
    made = PropertyValue()
    made.Name, made.Value = name, value
    return made


def main() -> None:
    source, copy, save_as, cells = sys.argv[1:]
    with tempfile.TemporaryDirectory() as profile:
        office = subprocess.Popen(
            [
                "soffice", f"-env:UserInstallation={Path(profile).as_uri()}", "--headless",
                "--norestore", f"--accept=pipe,name={PIPE};urp;",
            ]
        )  # fmt: skip
        try:
            type_in(connected(), source, copy, save_as, json.loads(cells))
        finally:
            office.terminate()
            office.wait(30)


def connected() -> object:
    local = uno.getComponentContext()
    resolver = local.ServiceManager.createInstanceWithContext(
        "com.sun.star.bridge.UnoUrlResolver", local
    )
    for _ in range(120):
        try:
            return resolver.resolve(f"uno:pipe,name={PIPE};urp;StarOffice.ComponentContext")
        except NoConnectException:
            time.sleep(0.5)
    raise TimeoutError("LibreOffice does not answer")


def type_in(context, source, copy, save_as, cells) -> None:
    def made(service: str):
        return context.ServiceManager.createInstanceWithContext(service, context)

    desktop, dispatcher = (
        made("com.sun.star.frame.Desktop"),
        made("com.sun.star.frame.DispatchHelper"),
    )
    document = desktop.loadComponentFromURL(
        Path(source).as_uri(), "_blank", 0, (option("Hidden", True),)
    )
    controller = document.CurrentController
    for sheet, address, text in cells:
        controller.setActiveSheet(document.Sheets.getByName(sheet))
        frame = controller.Frame
        dispatcher.executeDispatch(frame, ".uno:GoToCell", "", 0, (option("ToPoint", address),))
        dispatcher.executeDispatch(frame, ".uno:EnterString", "", 0, (option("StringName", text),))
    document.storeToURL(Path(copy).as_uri(), (option("FilterName", save_as),))
    document.close(True)


if __name__ == "__main__":
    main()
