"""The tables of a small sound fleet: one type of two modules, two aircraft of two engines, one spare engine."""

from __future__ import annotations

from pathlib import Path

from planner.schema.registry import TABLES
from planner.sheet import Sheet

Tables = dict[str, list[dict[str, str]]]
MODULES = ("fan", "HPT")


def _rows(text: str) -> list[dict[str, str]]:
    lines = [line.strip().split(",") for line in text.strip().splitlines()]
    return [dict(zip(lines[0], cells, strict=True)) for cells in lines[1:]]


def small_tables() -> Tables:
    """Return fresh rows of text by table, fit to be spoiled by a test."""
    tables: Tables = {
        "settings": _rows("name,value\nas_of,2026-07-01\nfleet_name,Small\nhorizon_years,5"),
        "indices": _rows("index,per_year_frac,step_month\nparts,0.06,1\nmaterial,0.05,1"),
        "season": [{"month": str(month), "share": "1.0"} for month in range(1, 13)],
        "engine_types": _rows(
            "engine_type,redline_degC,removal_margin_degC,cruise_fuel_kg_per_hour,engine_change_days,"
            "engine_change_usd,spare_price_usd,out_of_service_usd_per_day\nN,925,5,1180,1.5,25000,11500000,42000"
        ),
        "ratings": _rows("engine_type,rating,thrust_kN,new_margin_degC\nN,high,108,60\nN,low,90,112"),
        "module_types": _rows(
            "engine_type,module,behind,exchange_place,exchange_days,exchange_usd,spare_price_usd,repair_days_median,"
            "repair_days_p90\nN,fan,,near_wing,3,30000,1500000,45,60\nN,HPT,fan,shop,,,2300000,70,94.5"
        ),
        "wear": _rows(
            "engine_type,rating,module,early_loss_degC,loss_degC_per_1000_cycles,fuel_frac_per_degC\n"
            "N,high,fan,1,0.5,0.001\nN,high,HPT,6,2.1,0.0005\nN,low,fan,1,0.4,0.001\nN,low,HPT,5,1.3,0.0005"
        ),
        "hazards": _rows(
            "engine_type,module,cause,run,shape,scale,clock,counted_from,probability_within,ends_after_cycles\n"
            "N,HPT,distress,first,3,14200,cycles,restoration,,\nN,HPT,distress,mature,3,11400,cycles,restoration,,\n"
            "N,fan,unscheduled,first,1,90000,hours,restoration,,\nN,HPT,early,mature,,,cycles,build,0.02,150"
        ),
        "work": _rows(
            "engine_type,module,level,cost_usd,material_frac,repair_frac,labour_frac,restores_frac,access_usd,"
            "expected_interval_cycles\nN,fan,check,60000,0.1,0.2,0.7,0,30000,\n"
            "N,fan,restoration,250000,0.45,0.35,0.2,1,30000,14000\nN,fan,overhaul,420000,0.45,0.35,0.2,1,30000,16000\n"
            "N,HPT,check,140000,0.1,0.2,0.7,0,70000,\nN,HPT,restoration,1500000,0.45,0.35,0.2,1,70000,7500\n"
            "N,HPT,overhaul,1900000,0.45,0.35,0.2,1,70000,8500"
        ),
        "visits": _rows(
            "engine_type,visit,engine_level_usd,test_usd\nN,quick,150000,60000\nN,module_exchange,200000,60000\n"
            "N,core,320000,60000\nN,overhaul,380000,60000"
        ),
        "part_types": _rows(
            "part_number,engine_type,module,name,price_usd,counting_rule\n"
            "FAN-D1,N,fan,Fan disk,200000,linear\nHPT-D1,N,HPT,HPT disk,310000,linear"
        ),
        "part_limits": _rows(
            "part_number,rating,limit_cycles,source\nFAN-D1,high,20000,Manual rev 12\nFAN-D1,low,25000,Manual rev 12\n"
            "HPT-D1,high,15000,Manual rev 12\nHPT-D1,low,18500,Manual rev 12"
        ),
        "shops": _rows("shop,engine_type,inductions_per_month,module_inductions_per_month\nAlpha,N,1,3"),
        "shop_work": [
            {"shop": "Alpha", "engine_type": "N", "visit": v, "days_median": "95", "days_p90": "130"}
            for v in ("quick", "module_exchange", "core", "overhaul")
        ],
        "bases": _rows("base,environment\nHome,1"),
        "aircraft": _rows(
            "tail,sub_fleet,engine_type,rating,positions,base,hours_since_new,cycles_since_new,hours_per_year,"
            "cycles_per_year,etops_minutes,owner\nT-1,S,N,high,2,Home,16000,8000,3100,1900,0,Own\n"
            "T-2,S,N,low,2,Home,16000,8000,3100,1900,120,Own"
        ),
        "strategies": _rows("strategy,way_out\nwhole_engine,whole_engine\nexchange,exchange\ncheapest,cheapest"),
        "standards": _rows(
            "engine_type,module,standard,mates_with_module,mates_with_standard\nN,HPT,post,fan,post\nN,HPT,pre,fan,pre"
        ),
        "engines": [],
        "modules": [],
        "parts": [],
        "part_history": [],
    }
    for number in range(1, 6):
        _add_engine(tables, number)
    return tables


def _add_engine(tables: Tables, number: int) -> None:
    """Add engine E1 to E4 on a wing, E5 as a spare, with modules and parts of 8,000 cycles and their history."""
    spare = number == 5
    tail = "" if spare else f"T-{(number + 1) // 2}"
    rating = "low" if tail == "T-2" else "high"
    tables["engines"].append(
        {
            "engine_serial": f"E{number}",
            "engine_type": "N",
            "place": "spare" if spare else "wing",
            "tail": tail,
            "position": "" if spare else str((number + 1) % 2 + 1),
            "base": "Home" if spare else "",
            "owner": "Own",
            "standard": "post",
            "hours_since_new": "16000",
            "cycles_since_new": "8000",
            "cycles_since_build": "3000",
        }
    )
    for module in MODULES:
        serial = f"{module}-{number:02d}"
        tables["modules"].append(
            {
                "module_serial": serial,
                "engine_type": "N",
                "module": module,
                "engine_serial": f"E{number}",
                "standard": "post",
                "owner": "Own",
                "hours_since_new": "16000",
                "cycles_since_new": "8000",
                "hours_since_restoration": "6000",
                "cycles_since_restoration": "3000",
                "cycles_since_build": "3000",
                "hours_since_build": "6000",
            }
        )
        part = f"{module[0].upper()}{100 + number}"
        tables["parts"].append(
            {
                "part_serial": part,
                "part_number": "FAN-D1" if module == "fan" else "HPT-D1",
                "module_serial": serial,
                "owner": "Own",
                "cycles_since_new": "8000",
                "hours_since_new": "16000",
                "made_date": "2017-03-01",
                "status_substantiated": "yes",
                "trace_to_birth": "yes",
            }
        )
        for first, last, cycles in (("2017-07-01", "2021-06-30", "3500"), ("2021-07-01", "2026-07-01", "4500")):
            tables["part_history"].append(
                {
                    "part_serial": part,
                    "module_serial": serial,
                    "engine_serial": f"E{number}",
                    "tail": tail or "T-1",
                    "rating": rating,
                    "from_date": first,
                    "to_date": last,
                    "cycles": cycles,
                    "hours": str(2 * int(cycles)),
                    "source": "log",
                }
            )


def sheets(tables: Tables) -> list[Sheet]:
    """Return the tables as they stand after a file was opened: text, with spreadsheet rows."""
    result = []
    for name, rows in tables.items():
        headings = tuple(rows[0]) if rows else TABLES[name].names
        cells = [[row.get(heading, "") for heading in headings] for row in rows]
        result.append(Sheet(name, f"{name}.csv", headings, cells, list(range(2, len(rows) + 2))))
    return result


def write(folder: Path, tables: Tables) -> Path:
    """Write the tables as CSV files and return the folder."""
    folder.mkdir(parents=True, exist_ok=True)
    for sheet in sheets(tables):
        lines = [sheet.headings, *sheet.rows]
        text = "".join(",".join(f'"{c}"' if "," in c else c for c in line) + "\n" for line in lines)
        (folder / sheet.file).write_text(text, encoding="utf-8")
    return folder
