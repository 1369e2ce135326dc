"""An add-in for Calc with one function that does nothing: what any call of an add-in costs at least."""

from __future__ import annotations

from pathlib import Path

from thrustbook.addin.hosts.calc.typelib import Method, compiled

_COMPONENT = """
import unohelper
from com.sun.star.lang import XServiceInfo, XServiceName
from org.thrustbook.bench import XEmpty

NAME = "org.thrustbook.bench.Empty"


class Empty(unohelper.Base, XServiceInfo, XServiceName, XEmpty):
    def __init__(self, *_arguments):
        pass

    def getServiceName(self):
        return NAME

    def getImplementationName(self):
        return NAME

    def supportsService(self, name):
        return name in self.getSupportedServiceNames()

    def getSupportedServiceNames(self):
        return (NAME, "com.sun.star.sheet.AddIn")

    def BENCH_EMPTY(self, *_arguments):
        return ((0.0,),)


g_ImplementationHelper = unohelper.ImplementationHelper()
g_ImplementationHelper.addImplementation(Empty, NAME, (NAME, "com.sun.star.sheet.AddIn"))
"""
_COMPONENTS = """<?xml version="1.0" encoding="UTF-8"?>
<components xmlns="http://openoffice.org/2010/uno-components">
  <component loader="com.sun.star.loader.Python" uri="component.py">
    <implementation name="org.thrustbook.bench.Empty">
      <service name="org.thrustbook.bench.Empty"/>
      <service name="com.sun.star.sheet.AddIn"/>
    </implementation>
  </component>
</components>
"""
_MANIFEST = """<?xml version="1.0" encoding="UTF-8"?>
<manifest:manifest xmlns:manifest="http://openoffice.org/2001/manifest">
  <manifest:file-entry manifest:full-path="empty.rdb"
    manifest:media-type="application/vnd.sun.star.uno-typelibrary;type=RDB"/>
  <manifest:file-entry manifest:full-path="empty.components"
    manifest:media-type="application/vnd.sun.star.uno-components"/>
  <manifest:file-entry manifest:full-path="CalcAddIns.xcu"
    manifest:media-type="application/vnd.sun.star.configuration-data"/>
</manifest:manifest>
"""
_ADDIN = """<?xml version="1.0" encoding="UTF-8"?>
<oor:component-data xmlns:oor="http://openoffice.org/2001/registry" oor:name="CalcAddIns"
    oor:package="org.openoffice.Office">
<node oor:name="AddInInfo"><node oor:name="org.thrustbook.bench.Empty" oor:op="replace">
<node oor:name="AddInFunctions"><node oor:name="BENCH_EMPTY" oor:op="replace">
<prop oor:name="DisplayName"><value xml:lang="en-US">BENCH_EMPTY</value></prop>
<prop oor:name="Category"><value>Add-In</value></prop>
</node></node></node></node>
</oor:component-data>
"""


def add_empty_function(home: Path) -> None:
    """Unpack the add-in beside ours, for an office started from that folder."""
    folder = home / "extensions" / "empty"
    (folder / "META-INF").mkdir(parents=True)
    methods = [Method("BENCH_EMPTY", tuple(f"a{i}" for i in range(6)), False)]
    (folder / "empty.rdb").write_bytes(compiled("org.thrustbook.bench.XEmpty", methods))
    (folder / "component.py").write_text(_COMPONENT)
    (folder / "empty.components").write_text(_COMPONENTS)
    (folder / "CalcAddIns.xcu").write_text(_ADDIN)
    (folder / "META-INF" / "manifest.xml").write_text(_MANIFEST)
