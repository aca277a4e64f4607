function tables = load_session(folder)
  % Reads a folder of Lapwing tables: s = load_session(folder); s.laps.start_s(1). Octave, MATLAB.
  dict = columns_of(fullfile(folder, 'dictionary.csv'), repmat({'text'}, 1, 5));
  names = unique(dict{1}, 'stable');
  for n = 1:numel(names)
    rows = strcmp(dict{1}, names{n});
    body = columns_of(fullfile(folder, [names{n} '.csv']), dict{3}(rows)');
    fields = dict{2}(rows);
    for c = 1:numel(fields), tables.(names{n}).(fields{c}) = body{c}; end
  end
end
function body = columns_of(file, types)
  formats = repmat({'%f'}, 1, numel(types));
  formats(strcmp(types, 'text')) = {'%q'};
  id = fopen(file, 'r', 'n', 'UTF-8');
  body = textscan(id, [formats{:}], 'Delimiter', ',', 'HeaderLines', 1, 'EmptyValue', NaN, ...
                  'EndOfLine', sprintf('\r\n'), 'Whitespace', '');
  fclose(id);
end
