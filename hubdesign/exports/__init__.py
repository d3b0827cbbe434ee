"""From tables to files: CSV, JSON, GeoJSON, workbook, GIS formats, and the folder that holds them safely."""
