"""The tables of a plan by name, in the order of a saved plan; a dot stands for a table inside a table."""

from coverage_lab.plan import schema
from coverage_lab.plan import schema_targets as targets

TABLES: dict[str, type[schema.Table]] = {
    "study": schema.StudyTable,
    "outcome": schema.OutcomeTable,
    "sample": schema.SampleTable,
    "precision": targets.PrecisionTable,
    "rare": targets.RareTable,
    "decision": targets.DecisionTable,
    "standard": schema.StandardTable,
    "design": schema.DesignTable,
    "design.classification": targets.ClassificationTable,
    "design.loss": targets.LossTable,
    "simulation": schema.SimulationTable,
    "methods": schema.MethodsTable,
}

# What a layer of the design may say, by its name.
LAYER_KEYS: dict[str, tuple[str, ...]] = {
    name.removeprefix("design."): tuple(model.model_fields)
    for name, model in TABLES.items()
    if name.startswith("design.")
}
