-- The library: who, chips, computations, designs, requests, configurations, releases, history.
-- Addresses are SHA-256 of the stored text, checked by the database itself; what is published never changes.

-- ---------- rules
-- A deletion passes only inside a transaction that said `set local ringbinder.retention = 'on'`; foreign keys then
-- still keep whatever is referenced.
create function refuse_change() returns trigger language plpgsql as $$
begin
  if tg_op = 'DELETE' and current_setting('ringbinder.retention', true) = 'on' then return old; end if;
  raise exception '% is immutable: % refused', tg_table_name, tg_op using errcode = 'restrict_violation';
end $$;

-- QUEUED -> RUNNING -> DONE | FAILED | CANCELLED; a RUNNING one goes back to QUEUED when its worker died.
create function check_transition() returns trigger language plpgsql as $$
begin
  if old.state = new.state and old.state in ('DONE','FAILED','CANCELLED') then
    raise exception '% is final', old.state using errcode = 'restrict_violation';
  end if;
  if old.state is distinct from new.state and (old.state, new.state) not in
     (('QUEUED','RUNNING'),('QUEUED','DONE'),('QUEUED','FAILED'),('QUEUED','CANCELLED'),
      ('RUNNING','QUEUED'),('RUNNING','DONE'),('RUNNING','FAILED'),('RUNNING','CANCELLED')) then
    raise exception 'transition % -> % refused', old.state, new.state using errcode = 'restrict_violation';
  end if;
  return new;
end $$;

-- ---------- who
create table actor (
  id uuid primary key, kind text not null check (kind in ('PERSON','INSTRUMENT','SYSTEM')),
  name text not null unique check (name ~ '^[A-Za-z0-9][A-Za-z0-9 ._@-]{0,99}$'),
  created_at timestamptz(3) not null default now());

create table token (
  id uuid primary key, actor_id uuid not null references actor,
  lookup text not null unique check (lookup ~ '^[a-z0-9]{12}$'),
  secret_hash bytea not null check (octet_length(secret_hash) = 32),
  role text not null check (role in ('READER','DESIGNER','INSTRUMENT','ADMIN')),
  label text not null, created_at timestamptz(3) not null default now(), created_by uuid references actor,
  expires_at timestamptz(3), revoked_at timestamptz(3), revoked_by uuid references actor,
  check ((revoked_at is null) = (revoked_by is null)), check (expires_at > created_at));
create index token_actor on token (actor_id);
create unlogged table token_use (token_id uuid primary key references token, last_used_at timestamptz(3) not null);

create function token_only_revocation() returns trigger language plpgsql as $$
begin
  if old.revoked_at is not null or (to_jsonb(new) - array['revoked_at','revoked_by']) <> (to_jsonb(old) - array['revoked_at','revoked_by']) then
    raise exception 'a token can only be revoked, once' using errcode = 'restrict_violation';
  end if; return new;
end $$;
create trigger token_update before update on token for each row execute function token_only_revocation();
create trigger token_delete before delete on token for each row execute function refuse_change();

create table bootstrap (key text primary key, value jsonb not null, at timestamptz(3) not null default now());

-- ---------- chips
create table chip (
  id uuid primary key, serial text not null unique check (serial ~ '^[A-Za-z0-9][A-Za-z0-9._-]{0,63}$'),
  description text not null default '', head_revision int not null, retired_at timestamptz(3),
  created_at timestamptz(3) not null default now(), created_by uuid not null references actor,
  unique (id, head_revision));

create table chip_revision (
  id uuid primary key, chip_id uuid not null references chip, number int not null check (number > 0),
  hash text not null unique, canonical text not null,
  model jsonb not null generated always as ((canonical::jsonb) -> 'model') stored,
  note text not null default '', created_at timestamptz(3) not null default now(), created_by uuid not null references actor,
  check (hash = encode(sha256(convert_to(canonical,'UTF8')),'hex')),
  unique (chip_id, number), unique (id, chip_id));
alter table chip add foreign key (id, head_revision) references chip_revision (chip_id, number) deferrable initially deferred;

-- ---------- computations, designs, requests
create table computation (
  id uuid primary key, kind text not null, key text not null, canonical text not null, engine text not null,
  state text not null default 'QUEUED' check (state in ('QUEUED','RUNNING','DONE','FAILED','CANCELLED')),
  progress real not null default 0 check (progress between 0 and 1),
  attempt int not null default 0 check (attempt >= 0), waiters int not null check (waiters >= 0),
  problem jsonb, queued_at timestamptz(3) not null default now(), started_at timestamptz(3), finished_at timestamptz(3),
  check (key = encode(sha256(convert_to(canonical,'UTF8')),'hex')),
  check ((state = 'FAILED') = (problem is not null)),
  check ((finished_at is not null) = (state in ('DONE','FAILED','CANCELLED'))));
create unique index computation_single_flight on computation (kind, key) where state in ('QUEUED','RUNNING');
create trigger computation_state before update on computation for each row execute function check_transition();

create table design (
  id text primary key, canonical text not null,
  chip_id uuid not null, chip_revision_id uuid not null, engine text not null,
  family text, architecture text not null, filter_order int not null,
  met boolean not null, worst_margin_db double precision, insertion_loss_db double precision, rejection_db double precision,
  result jsonb not null, result_hash text not null check (result_hash ~ '^[0-9a-f]{64}$'),
  created_at timestamptz(3) not null default now(),
  check (id = encode(sha256(convert_to(canonical,'UTF8')),'hex')),
  foreign key (chip_revision_id, chip_id) references chip_revision (id, chip_id),
  unique (id, chip_revision_id));
create index design_recent on design (created_at desc, id desc);
create index design_chip_recent on design (chip_id, created_at desc, id desc);
-- Undefined rejection sorts last; the list's order and condition repeat this expression.
create index design_rejection on design ((coalesce(rejection_db, '-Infinity'::double precision)) desc, id desc);

-- A deterministic "no" is as cacheable as a design.
create table refusal (
  id text primary key, canonical text not null, problem jsonb not null, created_at timestamptz(3) not null default now(),
  check (id = encode(sha256(convert_to(canonical,'UTF8')),'hex')));

create table request (
  id uuid primary key, kind text not null default 'DESIGN', chip_id uuid not null, chip_revision_id uuid not null,
  asked jsonb not null, key text not null,
  computation_id uuid references computation, design_id text references design,
  state text not null check (state in ('QUEUED','RUNNING','DONE','FAILED','CANCELLED')),
  problem jsonb, created_at timestamptz(3) not null default now(), created_by uuid not null references actor,
  finished_at timestamptz(3), cancelled_by uuid references actor, token_id uuid references token,
  foreign key (chip_revision_id, chip_id) references chip_revision (id, chip_id),
  check ((state = 'FAILED') = (problem is not null)),
  check ((state = 'CANCELLED') = (cancelled_by is not null)),
  check ((finished_at is not null) = (state in ('DONE','FAILED','CANCELLED'))),
  check (state not in ('QUEUED','RUNNING') or computation_id is not null),
  check (state <> 'DONE' or kind <> 'DESIGN' or design_id is not null));
-- What a token may have open at once is counted here.
create index request_live_token on request (token_id) where state in ('QUEUED','RUNNING');
create index request_live on request (computation_id) where state in ('QUEUED','RUNNING');
create index request_recent on request (created_at desc, id desc);
create index request_actor_recent on request (created_by, created_at desc, id desc);
create trigger request_state before update on request for each row execute function check_transition();

create table idempotency (
  actor_id uuid not null references actor, key text not null check (key ~ '^[\x21-\x7e]{1,128}$'),
  operation text not null, fingerprint text not null, subject_id text not null,
  created_at timestamptz(3) not null default now(), primary key (actor_id, key));
create index idempotency_age on idempotency (created_at);

-- ---------- configurations and releases
create table configuration (
  id uuid primary key, chip_id uuid not null references chip,
  name text not null check (name ~ '^[A-Za-z0-9][A-Za-z0-9._-]{0,63}$'), last_version int not null default 0, retired_at timestamptz(3),
  created_at timestamptz(3) not null default now(), created_by uuid not null references actor,
  unique (chip_id, name), unique (id, chip_id));

create table configuration_version (
  id uuid primary key, configuration_id uuid not null, chip_id uuid not null, number int not null check (number > 0),
  chip_revision_id uuid not null, source_kind text not null check (source_kind in ('DESIGN','TRIAL','CURRENTS')),
  design_id text, setting jsonb not null, content_hash text not null, note text not null default '',
  created_at timestamptz(3) not null default now(), created_by uuid not null references actor,
  unique (configuration_id, number), unique (id, chip_id),
  foreign key (configuration_id, chip_id) references configuration (id, chip_id),
  foreign key (chip_revision_id, chip_id) references chip_revision (id, chip_id),
  foreign key (design_id, chip_revision_id) references design (id, chip_revision_id),
  check (source_kind <> 'DESIGN' or design_id is not null));

create table release (
  chip_id uuid not null, name text not null check (name ~ '^[A-Za-z0-9][A-Za-z0-9._-]{0,63}$'), sequence int not null check (sequence > 0),
  version_id uuid not null, note text not null default '', accepted jsonb not null default '[]',
  created_at timestamptz(3) not null default now(), created_by uuid not null references actor,
  primary key (chip_id, name, sequence),
  foreign key (version_id, chip_id) references configuration_version (id, chip_id));
create index release_version on release (version_id);
create table release_head (
  chip_id uuid not null references chip, name text not null, sequence int not null, primary key (chip_id, name), unique (chip_id, name, sequence),
  foreign key (chip_id, name, sequence) references release (chip_id, name, sequence) deferrable initially deferred);

-- ---------- history
create table history (
  id bigint generated always as identity primary key, tx xid8 not null default pg_current_xact_id(),
  at timestamptz(3) not null default clock_timestamp(), actor_id uuid not null references actor, token_id uuid references token,
  action text not null, subject_kind text not null, subject_id text not null, chip_id uuid references chip, detail jsonb not null default '{}');
create index history_subject on history (subject_kind, subject_id, id desc);
create index history_chip on history (chip_id, id desc) where chip_id is not null;
create index history_actor on history (actor_id, id desc);

-- key is also the key of a session-level advisory lock: whoever can take that lock knows that the process is dead.
create table worker_process (key bigint primary key, pool_ids text[] not null, engine text not null, started_at timestamptz(3) not null default now());
-- When a live worker of an engine was last seen: a queue longer than a restart must not look like a retired engine.
create table engine_service (engine text primary key, last_served_at timestamptz(3) not null);

-- ALWAYS: a session in the replica role skips ordinary triggers.
do $$ declare t text; begin
  foreach t in array array['chip_revision','design','refusal','configuration_version','release','history'] loop
    execute format('create trigger %I_immutable before update or delete on %I for each row execute function refuse_change()', t, t);
    execute format('create trigger %I_no_truncate before truncate on %I for each statement execute function refuse_change()', t, t);
    execute format('alter table %I enable always trigger %I', t, t || '_immutable');
    execute format('alter table %I enable always trigger %I', t, t || '_no_truncate');
  end loop; end $$;
