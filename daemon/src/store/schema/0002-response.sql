-- What is known of a pair beyond gain, skew and offset.
alter table corrections add column
    compensation_json text;                        -- how far slow and fast gain differ; null where it was not shown
alter table corrections add column
    response_json     text;                        -- the response that is applied; null for none
alter table corrections add column
    limit_json        text;                        -- the converters' limit of rejection; null where it was not seen
