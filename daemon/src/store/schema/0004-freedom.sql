-- How well standard uncertainties are known themselves, and what limits a skew.
alter table corrections add column
    skew_freedom   real;                           -- degrees of freedom of skew_u; null where it is taken as well known
alter table corrections add column
    gain_freedom   real;                           -- the same of gain_u
alter table corrections add column
    offset_freedom real;                           -- the same of offset_u
alter table corrections add column
    limited_by     text;                           -- what limits the skew most, in words; null where not known
alter table terms add column
    freedom        real;                           -- degrees of freedom of u; null where it is taken as well known
