-- Version 1 of the ledger's tables. Times are nanoseconds since 1970 in UTC,
-- hours count from 1970, an id is a hash of what it names. Plain SQL only:
-- distributed databases that speak PostgreSQL's language take it too, and those
-- that do not undo CREATE with a transaction can go through it again.
CREATE TABLE IF NOT EXISTS ledger_version (version bigint PRIMARY KEY);

-- What was booked, each line as it was written. Never updated, never deleted;
-- all other tables follow from this one.
CREATE TABLE IF NOT EXISTS ledger_lines (
    repository text NOT NULL,
    n bigint NOT NULL, -- from 1, without a gap
    body text NOT NULL, -- JSON
    chain uuid NOT NULL, -- of the line before it and of this one
    PRIMARY KEY (repository, n)
);

-- The last line of each repository. Bookings of a repository take their turn
-- at its row; those of different repositories do not meet.
CREATE TABLE IF NOT EXISTS ledger_heads (
    repository text PRIMARY KEY,
    n bigint NOT NULL,
    booked_at bigint NOT NULL,
    chain uuid NOT NULL
);

CREATE TABLE IF NOT EXISTS ledger_marks (
    id uuid PRIMARY KEY, -- of all that the mark says
    repository text NOT NULL,
    n bigint NOT NULL, -- its line
    at bigint NOT NULL
);
CREATE INDEX IF NOT EXISTS ledger_marks_at ON ledger_marks (at);

-- What entries are added up by: an account, and one line of its spending.
CREATE TABLE IF NOT EXISTS ledger_groups (
    id uuid PRIMARY KEY,
    repository text NOT NULL,
    account text NOT NULL,
    line text NOT NULL -- what a line of its spending has in common, JSON
);
CREATE INDEX IF NOT EXISTS ledger_groups_account ON ledger_groups (account, repository);

-- The entries in force, one for each part of a run.
CREATE TABLE IF NOT EXISTS ledger_entries (
    id uuid PRIMARY KEY, -- of repository, run, attempt and part
    attempt_id uuid NOT NULL, -- of repository, run and attempt
    group_id uuid NOT NULL,
    repository text NOT NULL,
    n bigint NOT NULL, -- its line
    starts bigint NOT NULL,
    ends bigint NOT NULL,
    in_doubt bigint NOT NULL, -- the entry, or its run for want of parts: 1 its emissions, 2 its energy
    run text NOT NULL, -- JSON
    proven_kwh double precision NOT NULL, -- of what is in doubt; else 0
    proven_g double precision NOT NULL, -- with embodied emissions
    inputs text NOT NULL,
    commit_id text NOT NULL,
    digest text NOT NULL
);
CREATE INDEX IF NOT EXISTS ledger_entries_attempt ON ledger_entries (attempt_id);
CREATE INDEX IF NOT EXISTS ledger_entries_ends ON ledger_entries (group_id, ends, starts);
CREATE INDEX IF NOT EXISTS ledger_entries_in_doubt ON ledger_entries (group_id, in_doubt, ends);
CREATE INDEX IF NOT EXISTS ledger_entries_inputs ON ledger_entries (inputs);
CREATE INDEX IF NOT EXISTS ledger_entries_commit ON ledger_entries (commit_id);
CREATE INDEX IF NOT EXISTS ledger_entries_digest ON ledger_entries (digest);

-- The attempts of each group by their start, to find the newest.
CREATE TABLE IF NOT EXISTS ledger_attempts (
    group_id uuid NOT NULL,
    begun bigint NOT NULL, -- its first part of this account, job and stage
    latest bigint NOT NULL, -- the start of its last part of them
    attempt_id uuid NOT NULL,
    PRIMARY KEY (group_id, begun, attempt_id)
);
CREATE INDEX IF NOT EXISTS ledger_attempts_latest ON ledger_attempts (group_id, latest);

-- The attempts of each group in every hour from their first start to their
-- last end, to find what an edge of a window cuts.
CREATE TABLE IF NOT EXISTS ledger_going (
    group_id uuid NOT NULL,
    hour bigint NOT NULL,
    attempt_id uuid NOT NULL,
    PRIMARY KEY (group_id, hour, attempt_id)
);

-- The sums of each hour. They are decimal, for decimals add and take away
-- without rounding: what was put in comes out again to the last digit.
CREATE TABLE IF NOT EXISTS ledger_hours (
    group_id uuid NOT NULL,
    hour bigint NOT NULL,
    facility_kwh numeric NOT NULL,
    operational_g numeric NOT NULL,
    embodied_g numeric NOT NULL,
    sure_kwh numeric NOT NULL, -- of entries against whose energy, or emissions, nothing speaks
    sure_g numeric NOT NULL,
    begun bigint NOT NULL, -- attempts whose first part started in the hour
    PRIMARY KEY (group_id, hour)
);

-- The same by days of UTC, whole ones: a month is then some thirty rows and not
-- some seven hundred.
CREATE TABLE IF NOT EXISTS ledger_days (
    group_id uuid NOT NULL,
    day bigint NOT NULL,
    facility_kwh numeric NOT NULL,
    operational_g numeric NOT NULL,
    embodied_g numeric NOT NULL,
    sure_kwh numeric NOT NULL,
    sure_g numeric NOT NULL,
    begun bigint NOT NULL,
    PRIMARY KEY (group_id, day)
);
