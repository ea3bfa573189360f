"""Studies in the user's data folder: SQLite (WAL) for what is decided, Parquet for records, one file per model."""

from app.store.lacking import ModelUnreadable, NoModelYet, NoSuchStudy
from app.store.studies import Store
from app.store.values import Asked, Choices, Plan, Study

__all__ = ["Asked", "Choices", "ModelUnreadable", "NoModelYet", "NoSuchStudy", "Plan", "Store", "Study"]
