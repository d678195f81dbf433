"""What a certification file needs of generated C, as text that is the same each time: no date, no path, no machine."""

from codegen.evidence.content import Evidence, Measured, evidence_json
from codegen.evidence.deviations import deviation_file
from codegen.evidence.loops import Loop, loops_of
from codegen.evidence.versions import dependency_versions

__all__ = ["Evidence", "Loop", "Measured", "dependency_versions", "deviation_file", "evidence_json", "loops_of"]
