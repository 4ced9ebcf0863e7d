"""The only room that speaks SQL: tables, connections, and the statements, by aggregate."""
