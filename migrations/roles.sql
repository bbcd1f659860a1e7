-- Who may do what in a record book on PostgreSQL, as grants: readers, contributors, curators.
--
-- Run it once for each book, as the role that made the book (`sidepath new`) and may create roles, in its database:
--     psql -d NAME -f roles.sql
-- then give people a role each:
--     GRANT sidepath_contributor TO mk;
-- Run it again after `sidepath migrate`, which may have made new tables. A book in a schema other than `public`: SET search_path TO name first. The three roles belong to
-- the whole server, what they may do to this book alone.
--
--     reader          sees everything, changes nothing.
--     contributor     records and imports runs, amends, withdraws and reinstates them, attaches files, acknowledges
--                     findings, keeps drafts.
--     curator         beside that: house rules, merging, settling what merged books say differently, reading the book
--                     again by a newer recipe.
--     owner           migrates, and grants. Keep that role for these two.
--
-- Nobody but the owner can change or delete a history entry, a run's row, an attached file or the book's log. What a
-- run says now is kept beside its history, so a contributor who writes SQL could change it behind the program's back;
-- `sidepath verify` names such a run, and its history still says what was recorded.

DO $$
BEGIN
    IF NOT EXISTS (SELECT FROM pg_roles WHERE rolname = 'sidepath_reader') THEN
        CREATE ROLE sidepath_reader NOLOGIN;
    END IF;
    IF NOT EXISTS (SELECT FROM pg_roles WHERE rolname = 'sidepath_contributor') THEN
        CREATE ROLE sidepath_contributor NOLOGIN;
    END IF;
    IF NOT EXISTS (SELECT FROM pg_roles WHERE rolname = 'sidepath_curator') THEN
        CREATE ROLE sidepath_curator NOLOGIN;
    END IF;
    EXECUTE format('REVOKE CREATE ON SCHEMA %I FROM PUBLIC', current_schema());
    EXECUTE format('GRANT USAGE ON SCHEMA %I TO sidepath_reader', current_schema());
    EXECUTE format('GRANT SELECT ON ALL TABLES IN SCHEMA %I TO sidepath_reader', current_schema());
END
$$;

GRANT sidepath_reader TO sidepath_contributor;
GRANT sidepath_contributor TO sidepath_curator;

-- Contributors: a run, its parts and what is derived from it; the book's counter and the tip of its history.
GRANT INSERT ON run, history, component, solvent, product_seen, failure, attachment, attachment_blob, recipe, facts,
    structure, run_structure, run_words, acknowledgement, draft TO sidepath_contributor;
GRANT UPDATE ON run, run_words TO sidepath_contributor;
GRANT UPDATE (value) ON meta TO sidepath_contributor;
GRANT DELETE ON component, solvent, product_seen, failure, attachment, facts, run_structure, draft TO sidepath_contributor;

-- Curators.
GRANT INSERT ON house_rule, event TO sidepath_curator;
GRANT UPDATE (title, motif, when_text, severity, why, source, author, created_at, retired_at, retired_by, retired_why)
    ON house_rule TO sidepath_curator;
GRANT UPDATE, DELETE ON structure TO sidepath_curator;
GRANT DELETE ON run_words TO sidepath_curator;

-- What is settled and what comes by a merge are history too: the rows that a contributor may add are told by their words.
ALTER TABLE history ENABLE ROW LEVEL SECURITY;
DROP POLICY IF EXISTS everybody_reads ON history;
DROP POLICY IF EXISTS contributors_add ON history;
DROP POLICY IF EXISTS curators_add ON history;
CREATE POLICY everybody_reads ON history FOR SELECT TO sidepath_reader USING (true);
CREATE POLICY contributors_add ON history FOR INSERT TO sidepath_contributor
    WITH CHECK (action IN ('add', 'amend', 'withdraw', 'reinstate') AND received_at IS NULL);
CREATE POLICY curators_add ON history FOR INSERT TO sidepath_curator WITH CHECK (true);
