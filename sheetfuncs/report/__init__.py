"""The diagnostics sheet: a host-neutral plan of it, and its drawing as a package of one sheet.

    plan.plan_sheet(check, title=..., ...) -> SheetPlan     what stands where, and how it looks
    draw.draw_plan(plan, out)                               the plan as an .xlsx of one sheet
    draw.draw_report(check, out, title=..., ...)            both in one call
"""
