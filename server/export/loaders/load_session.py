"""Reads a folder of Lapwing tables: load_session(folder)["laps"]["start_s"][0]. Python 3.8 on."""
import csv
import os


def load_session(folder):
    with open(os.path.join(folder, "dictionary.csv"), newline="", encoding="utf-8") as file:
        types = {(row["table"], row["column"]): row["type"] for row in csv.DictReader(file)}
    convert = {"number": float, "integer": int, "yes/no": lambda text: text == "1", "text": str}
    tables = {}
    for name in sorted({table for table, _ in types}):
        with open(os.path.join(folder, name + ".csv"), newline="", encoding="utf-8") as file:
            reader = csv.reader(file)
            columns = {column: [] for column in next(reader)}
            for row in reader:
                for (column, values), text in zip(columns.items(), row):
                    kind = types[name, column]
                    values.append(None if text == "" and kind != "text" else convert[kind](text))
        tables[name] = columns
    return tables
