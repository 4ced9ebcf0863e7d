"""The book file: stations, soils, systems, farms, fields, seasons and events in one JSON file."""

from app.book.schema import Book, BookError, read_book

__all__ = ["Book", "BookError", "read_book"]
