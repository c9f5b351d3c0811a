/* balance: by carrying the column through the years it needs. */
#include "balance.h"

#include <math.h>
#include <string.h>

int balance_make(Balance *balance, const Model *model, const double *x, double time, double years,
                 int threads, const Watcher *watcher, Fault *fault)
{
    *balance = (Balance){.drift = NAN};
    double last = years >= 2.0 ? 1.0 : 0.0;
    int code = column_make(&balance->column, model, fault);
    if (!code)
        code = stepper_make(&balance->stepper, model, threads, fault);
    if (!code) {
        Column *column = balance->column;
        if (x)
            memcpy(column->x, x,
                   (size_t)model->mechanism->solved * (size_t)model->grid.padded * sizeof(double));
        column->time = time;
        column_open_ledger(model, column);
        code = projection_spin_up(model, balance->stepper, column, years - last, 1.0, watcher, fault);
    }
    if (!code && last > 0.0) {
        Watcher quiet = {.stop = watcher->stop};
        double before = column_ozone_du(model, balance->column->x);
        code = projection_spin_up(model, balance->stepper, balance->column, last, 1.0, &quiet, fault);
        balance->drift = column_ozone_du(model, balance->column->x) - before;
    }
    if (code)
        balance_free(balance);
    return code;
}

void balance_free(Balance *balance)
{
    stepper_free(balance->stepper);
    column_free(balance->column);
    *balance = (Balance){0};
}

const double *balance_means(const Balance *balance, const Model *model)
{
    return model->settings.day == DAY_EXPLICIT ? stepper_mean(balance->stepper) : balance->column->x;
}
