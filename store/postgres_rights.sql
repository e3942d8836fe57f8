-- What a server may do, and nothing else: whoever owns the tables can take the
-- triggers off, so a server is best run as a role that owns nothing. SERVER
-- stands for that role. Run as the owner, after every migration.
GRANT USAGE ON SCHEMA public TO SERVER;
GRANT SELECT ON schema_migrations TO SERVER;
GRANT SELECT, INSERT ON identity, entries, terms, tree_hashes, idempotency TO SERVER;
GRANT SELECT, INSERT, UPDATE ON keys, standing, notices TO SERVER;
GRANT SELECT, UPDATE ON head TO SERVER;
GRANT SELECT, INSERT, DELETE ON sessions TO SERVER;
