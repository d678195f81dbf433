"""An agreement report as JUnit XML, so that a server of continuous integration shows each check as a test of its own.

The layout is the common one: testsuites, testsuite, testcase with failure (common practice, no published source). No
times and no dates: the same run gives the same text.
"""

from __future__ import annotations

import re
from xml.etree import ElementTree

from build_checks.report import AgreeReport, CheckResult, Run
from build_checks.report_text import to_text

# Extensible Markup Language 1.0, section 2.2
_NOT_IN_XML = re.compile("[^\t\n\r\x20-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")


def to_junit(report: AgreeReport) -> str:
    """The whole file."""
    run, results = report.run, report.results
    failures = str(sum(bool(result.failed) for result in results))
    counts = {"tests": str(len(results)), "failures": failures, "errors": "0"}
    root = ElementTree.Element("testsuites", {"name": "linkwright agree", **counts})
    suite = ElementTree.SubElement(root, "testsuite", {"name": _suite_name(run), **counts, "skipped": "0"})
    properties = ElementTree.SubElement(suite, "properties")
    for name, value in (("samples", run.samples), ("seed", run.seed), ("reach_m", run.reach)):
        ElementTree.SubElement(properties, "property", {"name": name, "value": str(value)})
    for result in results:
        _add_case(suite, run, result)
    ElementTree.SubElement(suite, "system-out").text = _printable(to_text(report))
    ElementTree.indent(root)
    return '<?xml version="1.0" encoding="UTF-8"?>\n' + ElementTree.tostring(root, encoding="unicode") + "\n"


def _suite_name(run: Run) -> str:
    return f"{run.arm}.{run.task}.{run.real}.{run.mathematics}"


def _add_case(suite: ElementTree.Element, run: Run, result: CheckResult) -> None:
    case = ElementTree.SubElement(suite, "testcase", {"classname": _suite_name(run), "name": result.check.value})
    if not result.failed:
        return
    what = result.failure.what if result.failure else ""
    message = f"{result.failed} of {result.cases} cases failed: {what}"
    attributes = {"type": result.check.name.lower(), "message": _printable(message)}
    failure = ElementTree.SubElement(case, "failure", attributes)
    details = result.failure.details if result.failure else {}
    failure.text = _printable("\n".join(f"{name}: {value}" for name, value in details.items()))


def _printable(text: str) -> str:
    return _NOT_IN_XML.sub("?", text)
