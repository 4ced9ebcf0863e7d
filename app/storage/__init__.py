"""The only room that speaks SQL: tables, connections, and one module of statements per aggregate."""
