"""Settings: what there is to set, the defaults with their sources, and a user's project laid over them."""

from siting.config.defaults import Default, default_vertical_error_m, defaults, sections
from siting.config.load import Project, load_project, note_defaults
from siting.config.template import project_template

__all__ = [
    "Default",
    "Project",
    "default_vertical_error_m",
    "defaults",
    "load_project",
    "note_defaults",
    "project_template",
    "sections",
]
